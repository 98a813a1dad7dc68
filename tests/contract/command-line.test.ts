// The command line as an operator and as other programs meet it, against the simulated bench over sockets: what
// it prints, its exit codes, and that a mistake in a file is found before any device is spoken to. In this
// process where that will do, in a process of its own where signals are part of the matter.
import { mkdir } from 'node:fs/promises';
import { afterEach, beforeEach, describe, expect, it } from 'vitest';
import type { SampleRecord } from '../../daemon/archive/archive.ts';
import { InThreadArchive } from '../../daemon/archive/in-thread-archive.ts';
import { adviceTable, type DaemonErrorCode } from '../../daemon/errors.ts';
import { type FiguresDocument, figuresDocument } from '../../daemon/results/figures-document.ts';
import { OperatorDesk, patternPlanText } from '../support/operator-desk.ts';

let desk: OperatorDesk;

beforeEach(async () => {
  desk = await OperatorDesk.open();
});

afterEach(async () => {
  await desk.close();
});

/** 820 to 920 MHz in steps of 10 MHz. */
const frequenciesHz = [820, 830, 840, 850, 860, 870, 880, 890, 900, 910, 920].map((mhz) => mhz * 1e6);
/** −170° … 180°: the two ends of a full turn are one direction. */
const anglesDeg = Array.from({ length: 36 }, (_, i) => -170 + 10 * i);
/** Boresight, 36 directions and the closure, boresight after 12, 24, 36 and at the end. */
const samplesOfPattern = 1 + 37 + 3 + 1;
const at870 = 5;

async function measureReference(): Promise<string> {
  desk.bench.mount('reference');
  const { exitCode, out, err } = await desk.run(['measure', desk.path('reference.plan.yaml')]);
  expect(err).toBe('');
  expect(exitCode).toBe(0);
  desk.bench.mount('aut');
  return out;
}

function valueAt(document: FiguresDocument, figure: 'realizedGainDbi' | 'peakDeg' | 'frontToBackDb'): number {
  const entry = document.cuts[0]?.figures[figure]?.[at870];
  return entry && 'value' in entry ? entry.value : Number.NaN;
}

/** The run of the pattern plan, against what the scene really does. */
function expectDocument(document: FiguresDocument): void {
  expect(document).toMatchObject({ run: 2, kind: 'pattern', state: 'complete', range: 'test meadow' });
  expect(document.frequenciesHz.map(Math.round)).toEqual(frequenciesHz);
  expect(document.markersHz).toEqual([870e6]);
  expect(document.gainReference).toMatchObject({ run: 1, antenna: 'half-wave dipole' });
  expect(document.cuts.map(({ name, axis, plane }) => ({ name, axis, plane }))).toEqual([
    { name: 'azimuth', axis: 'azimuth', plane: 'H' },
  ]);
  expect(document.cuts[0]?.anglesDeg.map((deg) => Math.round(deg * 100) / 100)).toEqual(anglesDeg);
  // The gain table of the range file is that of the scene's dipole to 0.01 dB; levels are read to 0.001 dB.
  const [truth] = desk.bench.truth({ frequenciesHz: [870e6] }).frequencies;
  const azimuth = truth!.azimuth;
  expect(Math.abs(valueAt(document, 'realizedGainDbi') - azimuth.realizedGainDbi)).toBeLessThan(0.05);
  expect(Math.abs(valueAt(document, 'frontToBackDb') - Number(azimuth.frontToBackDb))).toBeLessThan(0.05);
  expect(Math.abs(valueAt(document, 'peakDeg'))).toBeLessThan(0.5);
}

async function storedSamples(run: number): Promise<SampleRecord[]> {
  const archive = InThreadArchive.open(desk.archivePath);
  try {
    return await archive.samples(run);
  } finally {
    await archive.close();
  }
}

/** Every stored trace is what the scene has at the stored place: nothing else was let in. */
function expectScene(samples: readonly SampleRecord[]): void {
  for (const { sequence, track, traces } of samples) {
    const { azimuth = Number.NaN, elevation = Number.NaN } = track[0]?.position ?? {};
    const pose = { azimuthDeg: azimuth, elevationDeg: elevation, rollDeg: 0 };
    for (const [parameter, trace] of traces) {
      expect(trace).toHaveLength(2 * frequenciesHz.length);
      for (const [k, frequencyHz] of frequenciesHz.entries()) {
        const { re, im } = desk.bench.scene.s(parameter, frequencyHz, 0, pose);
        // Noise is 100 dB down; the strongest S21 of this range is below −20 dB.
        expect(Math.abs(trace[2 * k]! - re), `sample ${sequence}, ${parameter}`).toBeLessThan(1e-4);
        expect(Math.abs(trace[2 * k + 1]! - im), `sample ${sequence}, ${parameter}`).toBeLessThan(1e-4);
      }
    }
  }
}

describe('measuring', () => {
  it('takes reference and pattern, lists and shows them, for people and for programs', async () => {
    const reference = await measureReference();
    expect(reference).toContain('half-wave dipole A, complete\n');
    expect(desk.bench.instrument.settings.outputOn).toBe(false);
    expect(desk.bench.controller.state).toBe('Idle');
    expect(await desk.run(['show', '1'])).toEqual({ exitCode: 0, out: reference, err: '' });

    const measured = await desk.run(['measure', desk.path('pattern.plan.yaml'), '--json']);
    expect(measured.exitCode).toBe(0);
    expect(await desk.run(['show', '2', '--json'])).toEqual({ exitCode: 0, out: measured.out, err: '' });
    expectDocument(figuresDocument.parse(JSON.parse(measured.out)));
    expectScene(await storedSamples(2));

    const shown = await desk.run(['show', '2']);
    expect(shown.out).toContain('river-gauge yagi C, complete\n');
    expect(shown.out).toMatch(/^realized gain +\d+\.\d\d .*dBi$/m);
    const levels = figuresDocument.parse(
      JSON.parse((await desk.run(['show', '2', '--json', '--levels'])).out),
    );
    expect(levels.cuts[0]?.levelDb).toHaveLength(frequenciesHz.length);
    expect(levels.cuts[0]?.levelDb?.[at870]).toHaveLength(anglesDeg.length);

    const rows = (await desk.run(['runs'])).out.trimEnd().split('\n');
    expect(rows).toHaveLength(3);
    expect(rows[1]).toMatch(new RegExp(`^ *2 +pattern +river-gauge yagi C +complete +${samplesOfPattern} `));
    expect(rows[2]).toMatch(/^ *1 +reference +half-wave dipole A +complete +5 /);
    const runs = JSON.parse((await desk.run(['runs', '--json'])).out);
    expect(runs.nightcut).toBe('runs/1');
    expect(runs.runs.map((run: { number: number; state: string }) => [run.number, run.state])).toEqual([
      [2, 'complete'],
      [1, 'complete'],
    ]);
  });

  it('does all of it as a process of its own', async () => {
    desk.bench.mount('reference');
    const measured = await desk.start(['measure', 'reference.plan.yaml', '--json']).ended;
    expect(measured.err).toBe('');
    expect(measured.exitCode).toBe(0);
    const document = figuresDocument.parse(JSON.parse(measured.out));
    expect(document).toMatchObject({ run: 1, kind: 'reference', state: 'complete' });
    const shown = await desk.start(['show', '1', '--json']).ended;
    expect(JSON.parse(shown.out)).toEqual(JSON.parse(measured.out));
  });
});

describe('mistakes are found before anything is done', () => {
  const pattern = 'pattern.plan.yaml';
  const noReference = patternPlanText({ gainReference: 'none' });

  async function expectRefusal(args: string[], code: DaemonErrorCode, says: RegExp): Promise<void> {
    const { exitCode, out, err } = await desk.run(args);
    expect(err).toMatch(/^nightcut: [^\n]+\n$/);
    expect(err).toMatch(says);
    expect(out).toBe('');
    expect(exitCode).toBe(2);
    const asJson = await desk.run([...args, '--json']);
    expect(asJson.exitCode).toBe(2);
    expect(asJson.err).toMatch(/^nightcut: [^\n]+\n$/);
    expect(JSON.parse(asJson.out)).toMatchObject({
      nightcut: 'error/1',
      code,
      nextStep: adviceTable[code].nextStep,
    });
    expect(desk.visitors).toBe(0);
    expect(desk.bench.controller.shaftAt(desk.benchClock.monotonicMs())).toEqual([0, 0, 0]);
  }

  const wrongPlans: [what: string, change: [string, string], code: DaemonErrorCode, says: RegExp][] = [
    ['a key nobody knows', ['markers:', 'markres:'], 'FILE_INVALID', /pattern\.plan\.yaml:4: .*markers/],
    ['a missing key', ['kind: pattern\n', ''], 'FILE_INVALID', /kind/],
    ['a wrong unit', ['step: 10 deg', 'step: 10 MHz'], 'FILE_INVALID', /:8: .*step/],
    ['no unit at all', ['ifBandwidth: 1 kHz', 'ifBandwidth: 1000'], 'FILE_INVALID', /:5: .*ifBandwidth/],
    ['a value out of range', ['points: 11', 'points: -3'], 'FILE_INVALID', /:3: .*points/],
    ['a value of the wrong type', ['points: 11', 'points: many'], 'FILE_INVALID', /:3: .*points/],
    ['a band upside down', ['from: 820 MHz', 'from: 930 MHz'], 'FILE_INVALID', /:3: /],
    ['no YAML', ['cuts:', 'cuts: ['], 'FILE_INVALID', /pattern\.plan\.yaml:\d+: /],
    ['a cut outside travel', ['to: 180 deg', 'to: 205 deg'], 'FILE_INVALID', /:8: /],
    [
      'an axis the range does not have',
      ['axis: azimuth', 'axis: azimut'],
      'PLAN_AXIS_UNKNOWN',
      /did you mean azimuth/,
    ],
  ];

  it.each(wrongPlans)('a plan with %s', async (_, [from, to], code, says) => {
    expect(noReference).toContain(from);
    await desk.write(pattern, noReference.replace(from, to));
    await expectRefusal(['measure', desk.path(pattern)], code, says);
  });

  it('a plan that needs more than the travel of an axis', async () => {
    await desk.write(pattern, noReference);
    const narrow = desk
      .rangeText()
      .replace('{ min: -200 deg, max: 200 deg }', '{ min: -170 deg, max: 185 deg }');
    await desk.write('range.yaml', narrow);
    await expectRefusal(['measure', desk.path(pattern)], 'PLAN_OUTSIDE_TRAVEL', /outside its travel of -170/);
  });

  it('a range file with a wrong key, or none at all', async () => {
    await desk.write('range.yaml', desk.rangeText().replace('byteOrder', 'byteorder'));
    await expectRefusal(['measure', desk.path(pattern)], 'FILE_INVALID', /range\.yaml:7: .*byteOrder/);
    await expectRefusal(
      ['measure', desk.path(pattern), '--range', desk.path('site.yaml')],
      'FILE_UNREADABLE',
      /site\.yaml: .*no such file/,
    );
  });

  it('a plan that is not there', async () => {
    await expectRefusal(['measure', desk.path('yagi.plan.yaml')], 'FILE_UNREADABLE', /no such file/);
  });

  it('a pattern without its gain reference', async () => {
    await expectRefusal(
      ['measure', desk.path(pattern)],
      'REFERENCE_MISSING',
      /measure the reference antenna first/,
    );
  });

  it.each<[what: string, args: string[]]>([
    ['an option nobody knows', ['measure', 'a.plan.yaml', '--fast']],
    ['a command nobody knows', ['blub']],
    ['a plan too many', ['measure', 'a.plan.yaml', 'b.plan.yaml']],
    ['no plan', ['measure']],
    ['a run that is no number', ['show', 'last']],
    ['an option without its value', ['runs', '--archive']],
  ])('%s', async (_, args) => {
    const { exitCode, out, err } = await desk.run(args);
    expect(err).toMatch(/^nightcut: [^\n]+\n$/);
    expect(out).toBe('');
    expect(exitCode).toBe(2);
    expect(desk.visitors).toBe(0);
  });

  it('a reference run on a range that names no reference antenna', async () => {
    await desk.write('range.yaml', desk.rangeText().replace(/ {2}reference:\n.*(?=archive:)/s, ''));
    await expectRefusal(
      ['measure', desk.path('reference.plan.yaml')],
      'REFERENCE_MISSING',
      /names no reference antenna/,
    );
  });

  it('usage as a document for programs', async () => {
    await expectRefusal(['measure', '--fast'], 'USAGE_WRONG', /--fast/);
  });

  it('no arguments: one line that says what there is', async () => {
    const { exitCode, out, err } = await desk.run([]);
    expect(err).toMatch(/^nightcut: [^\n]*measure[^\n]*runs[^\n]*show[^\n]*\n$/);
    expect(out).toBe('');
    expect(exitCode).toBe(2);
  });

  it('an archive that is not there', async () => {
    await expectRefusal(['show', '1'], 'FILE_UNREADABLE', /there is no archive here/);
    await expectRefusal(['runs'], 'FILE_UNREADABLE', /there is no archive here/);
  });

  it('help and version are no mistakes', async () => {
    const help = await desk.run(['measure', '--help']);
    expect(help).toMatchObject({ exitCode: 0, err: '' });
    expect(help.out).toContain('--range');
    expect(await desk.run(['--version'])).toMatchObject({ exitCode: 0, out: '0.1.0\n', err: '' });
  });
});

describe('what the archive does not have', () => {
  it('refuses a run number it does not know, and a reference on another grid', async () => {
    await measureReference();
    const visitors = desk.visitors;
    const unknown = await desk.run(['show', '99', '--json']);
    expect(unknown).toMatchObject({
      exitCode: 2,
      err: expect.stringMatching(/^nightcut: [^\n]*99[^\n]*\n$/),
    });
    expect(JSON.parse(unknown.out)).toMatchObject({ code: 'ARCHIVE_NO_SUCH_RUN' });

    for (const [changes, code] of [
      [{ points: 21 }, 'REFERENCE_DOES_NOT_FIT'],
      [{ gainReference: '7' }, 'ARCHIVE_NO_SUCH_RUN'],
    ] as const) {
      await desk.write('pattern.plan.yaml', patternPlanText(changes));
      const refused = await desk.run(['measure', desk.path('pattern.plan.yaml'), '--json']);
      expect(refused).toMatchObject({ exitCode: 2, err: expect.stringMatching(/^nightcut: [^\n]+\n$/) });
      expect(JSON.parse(refused.out)).toMatchObject({ code });
    }
    // A reference belongs to the site it was taken on.
    await desk.write('range.yaml', desk.rangeText().replace('test meadow', 'other meadow'));
    for (const [gainReference, code] of [
      ['1', 'REFERENCE_DOES_NOT_FIT'],
      ['latest', 'REFERENCE_MISSING'],
    ] as const) {
      await desk.write('pattern.plan.yaml', patternPlanText({ gainReference }));
      const refused = await desk.run(['measure', desk.path('pattern.plan.yaml'), '--json']);
      expect(JSON.parse(refused.out)).toMatchObject({ code });
    }
    expect(desk.visitors).toBe(visitors);
    expect(JSON.parse((await desk.run(['runs', '--json'])).out).runs).toHaveLength(1);
  });
});

describe('trouble with the world', () => {
  it('ends with 3 when nobody listens, and stores no run', async () => {
    await desk.bench.close();
    const { exitCode, err } = await desk.run(['measure', desk.path('reference.plan.yaml')]);
    expect(exitCode).toBe(3);
    expect(err).toMatch(/^nightcut: [^\n]*\nLINK_OPEN_FAILED: [^\n]+\n$/);
    expect((await desk.run(['runs'])).out).toBe('no runs yet\n');
  });

  it('ends with 3 when the analyzer has another setting than the plan, before anything moves', async () => {
    const plan = patternPlanText({ gainReference: 'none' }).replace('1 kHz', '1.234 kHz');
    await desk.write('pattern.plan.yaml', plan);
    const { exitCode, err } = await desk.run(['measure', desk.path('pattern.plan.yaml')]);
    expect(exitCode).toBe(3);
    expect(err).toMatch(/^nightcut: IF bandwidth[^\n]*1234[^\n]*1500[^\n]*\nANALYZER_SETTING_DIFFERS: /);
    expect(desk.bench.controller.shaftAt(desk.benchClock.monotonicMs())).toEqual([0, 0, 0]);
    expect(desk.bench.instrument.settings.outputOn).toBe(false);
  });

  it('refuses a false zero after a controller restart, until the operator vouches for it', async () => {
    await measureReference();
    const plan = desk.path('pattern.plan.yaml');
    const restart = (): void => void desk.bench.faults.injectAfter('restart', 60);
    restart();
    expect((await desk.run(['measure', plan])).exitCode).toBe(3);
    const again = await desk.run(['measure', plan]);
    expect(again.exitCode).toBe(3);
    expect(again.err).toContain('POSITIONER_REFERENCE_LOST');
    expect(again.err).toContain('--zero-is-true');
    expect(again.out).toBe('');
    const vouched = await desk.run(['measure', plan, '--zero-is-true']);
    expect(vouched.exitCode).toBe(0);
  });

  it('names the log when it cannot be written, and measures nothing', async () => {
    await mkdir(`${desk.archivePath}.log`);
    const { exitCode, err } = await desk.run(['measure', desk.path('reference.plan.yaml')]);
    expect(exitCode).toBe(7);
    expect(err).toContain('the log cannot be written');
    expect(desk.visitors).toBe(0);
  });

  it('ends quietly when the reader of its output has seen enough', async () => {
    await measureReference();
    const { child, ended } = desk.start(['show', '1', '--json']);
    child.stdout?.destroy();
    const { err } = await ended;
    expect(err).toBe('');
  });

  it('ends with 5 when asked to stop, with everything announced in the archive', async () => {
    await desk.write('pattern.plan.yaml', patternPlanText({ gainReference: 'none' }));
    let ask = (): void => {};
    let turns = 0;
    desk.bench.controller.answered$.subscribe(() => {
      turns += 1;
      if (turns === 60) ask();
    });
    const { exitCode, err } = await desk.run(['measure', desk.path('pattern.plan.yaml')], (stop) => {
      ask = stop;
    });
    expect(exitCode).toBe(5);
    expect(err).toContain('run 1 ended early: stopped on request\n');
    await expectSafeAndKept();
  });

  it('survives garbage from the instrument: logged, not stored', async () => {
    await desk.write('pattern.plan.yaml', patternPlanText({ gainReference: 'none' }));
    const said: Uint8Array[] = [];
    const before = desk.bench.instrument.faults;
    let sweeps = 0;
    desk.bench.instrument.faults = {
      ...before,
      onTraces: (traces) => {
        sweeps += 1;
        // The poll for the end, a trace, the events after it, the frequency axis.
        if (sweeps % 9 === 5)
          desk.bench.faults.injectAfter('garbage-answer', 1 + (Math.floor(sweeps / 9) % 4));
        before.onTraces?.(traces);
      },
      onAnswer: (answer, message) => {
        const leaves = before.onAnswer?.(answer, message);
        if (leaves && leaves !== answer) said.push(leaves);
        return leaves;
      },
    };
    const { exitCode, err } = await desk.run(['measure', desk.path('pattern.plan.yaml')]);
    expect(err).toMatch(/analyzer: /);
    expect(exitCode).toBe(0);
    expect(said.length).toBeGreaterThanOrEqual(4);
    const log = JSON.stringify(await desk.log());
    for (const bytes of said) {
      // The first 32 bytes as they came, line end apart.
      const hex = Array.from(bytes.slice(0, -1), (byte) => byte.toString(16).padStart(2, '0'));
      expect(log).toContain(hex.slice(0, 32).join(' '));
    }
    const samples = await storedSamples(1);
    expect(samples.filter(({ purpose }) => purpose !== 'tie')).toHaveLength(37);
    expectScene(samples);
    const document = figuresDocument.parse(JSON.parse((await desk.run(['show', '1', '--json'])).out));
    expect(document.state).toBe('complete');
  });
});

/** After an early end: motors still, source off, the archive has what was announced and can be shown. */
async function expectSafeAndKept(): Promise<void> {
  const stands = desk.bench.controller.shaftAt(desk.benchClock.monotonicMs());
  await desk.benchClock.sleep(3000);
  expect(desk.bench.controller.shaftAt(desk.benchClock.monotonicMs())).toEqual(stands);
  expect(desk.bench.controller.state).toBe('Idle');
  expect(desk.bench.instrument.settings.outputOn).toBe(false);
  expect(desk.bench.instrument.isSweeping).toBe(false);

  const announced = (await desk.log())
    .filter((line) => line['msg'] === 'sample')
    .map((line) => line['sequence']);
  expect(announced.length).toBeGreaterThan(2);
  const samples = await storedSamples(1);
  expect(samples.map((sample) => sample.sequence)).toEqual(expect.arrayContaining(announced));
  expect(samples.length).toBeLessThan(samplesOfPattern);
  expectScene(samples);

  const shown = await desk.run(['show', '1', '--json']);
  expect(shown.exitCode).toBe(0);
  expect(figuresDocument.parse(JSON.parse(shown.out))).toMatchObject({
    state: 'interrupted',
    reason: 'stopped on request',
  });
  expect((await desk.run(['show', '1'])).out).toContain('interrupted: stopped on request');
}

describe.each(['SIGINT', 'SIGTERM'] as const)('%s to the process in mid-move', (signal) => {
  it('stops motors and source, keeps what was announced, and ends with 5', async () => {
    await desk.close();
    // Slow enough to be met in motion.
    desk = await OperatorDesk.open({ acceleration: 15 });
    await desk.write('pattern.plan.yaml', patternPlanText({ gainReference: 'none' }));
    const { child, ended } = desk.start(['measure', 'pattern.plan.yaml']);
    const early = ended.then(({ err }) => {
      throw new Error(`ended before it was asked to: ${err}`);
    });
    early.catch(() => {});
    const met = (async () => {
      let moves = 0;
      let wasMoving = false;
      while (moves < 8) {
        await desk.benchClock.sleep(30);
        const moving = desk.bench.controller.state === 'Run';
        if (moving && !wasMoving) moves += 1;
        wasMoving = moving;
      }
    })();
    await Promise.race([met, early]);
    child.kill(signal);
    const { exitCode, err } = await ended;
    expect(exitCode).toBe(5);
    expect(err).toContain('run 1 ended early: stopped on request\n');
    expect(err).not.toContain('NOT CONFIRMED');
    await expectSafeAndKept();
  });
});
