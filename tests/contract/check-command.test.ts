// `nightcut check` as an operator and as other programs meet it: go and no-go with their exit codes, and that a
// check visits no device and makes no file.
import { createHash } from 'node:crypto';
import { readdir, readFile } from 'node:fs/promises';
import { afterEach, beforeEach, describe, expect, it } from 'vitest';
import { type CheckDocument, checkDocument } from '../../daemon/plan/preflight/check-document.ts';
import { OperatorDesk, patternPlanText } from '../support/operator-desk.ts';

let desk: OperatorDesk;

beforeEach(async () => {
  desk = await OperatorDesk.open();
});

afterEach(async () => {
  expect(desk.bench.controller.shaftAt(desk.benchClock.monotonicMs())).toEqual([0, 0, 0]);
  await desk.close();
});

async function checked(plan: string): Promise<{ exitCode: number; document: CheckDocument }> {
  const { exitCode, out, err } = await desk.run(['check', desk.path(plan), '--json']);
  expect(err).toBe('');
  return { exitCode, document: checkDocument.parse(JSON.parse(out)) };
}

function verdictOf(document: CheckDocument, subject: string): string | undefined {
  return document.checks.find((check) => check.subject === subject)?.verdict;
}

/** What the desk's range file and plan leave out. */
async function writeAllKnown(): Promise<void> {
  const range = desk
    .rangeText()
    .replace(
      'rangeLength: 6 m',
      'rangeLength: 6 m\nheights: { rangeAntenna: 3 m, aut: 3 m }\nnearestWall: 9 m',
    )
    .replace('autPort: 1', 'autPort: 1\n  noiseFloor: { level: -110 dBm, ifBandwidth: 1 kHz }')
    .replace('archive:', 'autOffset: 0 m\ncableLoss: 3 dB\narchive:')
    .replace('rangeAntenna: range antenna', '$&\n  rangeAntennaSize: 0.3 m\n  rangeAntennaGain: 8 dBi');
  await desk.write('range.yaml', range);
  const plan = patternPlanText({ gainReference: 'none' });
  await desk.write(
    'known.plan.yaml',
    plan.replace('revision: C', 'revision: C, size: 55 cm, expectedGain: 11 dBi'),
  );
}

describe('a check before the night', () => {
  it('says go, with everything known checked, and visits nobody', async () => {
    await writeAllKnown();
    const before = await readdir(desk.folder);
    const { exitCode, document } = await checked('known.plan.yaml');
    expect(exitCode).toBe(0);
    expect(document).toMatchObject({
      verdict: 'go',
      antenna: { name: 'river-gauge yagi', revision: 'C' },
      range: 'test meadow',
      predicted: { samples: 1 + 37 + 3 + 1 },
    });
    expect(document.checks.filter((check) => check.verdict === 'not-checked')).toEqual([]);
    for (const subject of [
      'far-field',
      'link-budget',
      'angular-step',
      'frequency-grid',
      'travel',
      'disk-space',
    ]) {
      expect(verdictOf(document, subject), subject).toBe('go');
    }
    expect(verdictOf(document, 'ground-bounce')).toBe('caution');
    expect(desk.visitors).toBe(0);
    expect(await readdir(desk.folder)).toEqual(before);
  });

  it('says for people what it says for programs', async () => {
    await writeAllKnown();
    const { document } = await checked('known.plan.yaml');
    const { exitCode, out, err } = await desk.run(['check', desk.path('known.plan.yaml')]);
    expect(err).toBe('');
    expect(exitCode).toBe(0);
    expect(out).toMatch(
      /^river-gauge yagi C on test meadow: GO, 2 cautions\n42 samples, at least 1 min \d\d s; /,
    );
    for (const check of document.checks.filter(
      ({ subject }) => subject !== 'duration' && subject !== 'disk-space',
    )) {
      expect(out).toContain(check.text);
      if (check.change !== undefined) expect(out).toContain(`change: ${check.change}`);
    }
  });

  it('judges nothing it has no input for, and says what to give', async () => {
    await desk.write('bare.plan.yaml', patternPlanText({ gainReference: 'none' }));
    const { exitCode, document } = await checked('bare.plan.yaml');
    expect(exitCode).toBe(0);
    expect(verdictOf(document, 'far-field')).toBe('not-checked');
    const { out } = await desk.run(['check', desk.path('bare.plan.yaml')]);
    expect(out).toMatch(/^far field +not checked +give antennas\.rangeAntennaSize in the range file, /m);
  });

  it('says no-go with 1 and every reason at once', async () => {
    await writeAllKnown();
    const plan = patternPlanText()
      .replace('revision: C', 'revision: C, size: 2 m, expectedGain: 11 dBi')
      .replace('axis: azimuth', 'axis: roll');
    await desk.write('wrong.plan.yaml', plan);
    const { exitCode, document } = await checked('wrong.plan.yaml');
    expect(exitCode).toBe(1);
    expect(document.verdict).toBe('no-go');
    for (const subject of ['far-field', 'angular-step', 'travel', 'gain-reference']) {
      expect(verdictOf(document, subject), subject).toBe('no-go');
    }
    const { exitCode: again, out } = await desk.run(['check', desk.path('wrong.plan.yaml')]);
    expect(again).toBe(1);
    expect(out).toContain('NO-GO, 4 no-go');
    expect(out).toContain('has no axis roll');
    expect(desk.visitors).toBe(0);
    expect(await readdir(desk.folder)).not.toContain('nightcut.sqlite');
  });

  it('ends with 2 for a wrong file or an unknown plan', async () => {
    await desk.write('wrong.plan.yaml', patternPlanText().replace('820 MHz', '820'));
    for (const plan of ['wrong.plan.yaml', 'missing.plan.yaml']) {
      const { exitCode, err } = await desk.run(['check', desk.path(plan)]);
      expect(exitCode).toBe(2);
      expect(err).toMatch(/^nightcut: [^\n]+\n$/);
    }
    const { out } = await desk.run(['check', desk.path('wrong.plan.yaml'), '--json']);
    expect(JSON.parse(out)).toMatchObject({ nightcut: 'error/1', code: 'FILE_INVALID' });
  });

  it('reads the gain reference of the archive and leaves the archive as it was', async () => {
    desk.bench.mount('reference');
    expect((await desk.run(['measure', desk.path('reference.plan.yaml')])).exitCode).toBe(0);
    desk.bench.mount('aut');
    const visitors = desk.visitors;
    const hash = async (): Promise<string> =>
      createHash('sha256')
        .update(await readFile(desk.archivePath))
        .digest('hex');
    const before = await hash();

    const fits = await checked('pattern.plan.yaml');
    expect(fits.exitCode).toBe(0);
    expect(fits.document.checks.find((check) => check.subject === 'gain-reference')).toMatchObject({
      verdict: 'go',
      facts: { run: 1, rangeLengthM: 6 },
    });
    await desk.write('finer.plan.yaml', patternPlanText({ points: 21 }));
    const other = await checked('finer.plan.yaml');
    expect(other.exitCode).toBe(1);
    const finding = other.document.checks.find((check) => check.subject === 'gain-reference');
    expect(finding?.text).toContain('run 1 has 11 points');
    await desk.write('range.yaml', desk.rangeText().replace('rangeLength: 6 m', 'rangeLength: 7 m'));
    expect(verdictOf((await checked('pattern.plan.yaml')).document, 'gain-reference')).toBe('no-go');

    expect(await hash()).toBe(before);
    expect(desk.visitors).toBe(visitors);
  });

  it('refuses what is no archive, and takes an empty file for none', async () => {
    for (const [text, told] of [
      ['no archive at all, but longer than a page of it would be\n'.repeat(100), 'cannot'],
      ['', 'there is no archive at'],
    ] as const) {
      await desk.write('nightcut.sqlite', text);
      const { exitCode, document } = await checked('pattern.plan.yaml');
      expect(exitCode).toBe(1);
      const finding = document.checks.find((check) => check.subject === 'gain-reference');
      expect(finding).toMatchObject({ verdict: 'no-go', text: expect.stringContaining(told) });
      expect(await readFile(desk.archivePath, 'utf8')).toBe(text);
    }
  });

  it('says so when the folder of the archive is not there', async () => {
    await desk.write('bare.plan.yaml', patternPlanText({ gainReference: 'none' }));
    const archive = desk.path('gone/a.sqlite');
    const { exitCode, out } = await desk.run(['check', desk.path('bare.plan.yaml'), '--archive', archive]);
    expect(exitCode).toBe(1);
    expect(out).toMatch(/^disk space +no-go +there is no folder /m);
  });
});
