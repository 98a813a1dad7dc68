// The real daemon killed at any moment of a run over real sockets, then resumed: what the log announced is in
// the archive, none doubled, and the run ends with the positions of one that was never killed.
import { afterEach, beforeEach, describe, expect, it } from 'vitest';
import type { SampleRecord } from '../../daemon/archive/archive.ts';
import { InThreadArchive } from '../../daemon/archive/in-thread-archive.ts';
import { stream } from '../../mocks/random.ts';
import { OperatorDesk, patternPlanText } from '../support/operator-desk.ts';

let desk: OperatorDesk;

beforeEach(async () => {
  desk = await OperatorDesk.open({ acceleration: 30 });
  await desk.write('pattern.plan.yaml', patternPlanText({ gainReference: 'none' }));
});

afterEach(async () => {
  await desk.close();
});

async function stored(): Promise<SampleRecord[]> {
  const archive = InThreadArchive.open(desk.archivePath);
  try {
    return await archive.samples(1);
  } finally {
    await archive.close();
  }
}

/** −180° … 180° in steps of 10°, the end again as closure. */
const wanted = Array.from({ length: 37 }, (_, i) => `${i === 36 ? 'closure' : 'cut'} ${10 * i - 180}`).sort();

function positions(samples: readonly SampleRecord[]): string[] {
  return samples
    .filter((sample) => sample.purpose === 'cut' || sample.purpose === 'closure')
    .map((sample) => `${sample.purpose} ${sample.angleDeg}`)
    .sort();
}

async function announced(): Promise<number[]> {
  return (await desk.log())
    .filter((line) => line['msg'] === 'sample')
    .map((line) => Number(line['sequence']));
}

describe.each([1, 2, 3, 4])('killed at a moment drawn from seed %i', (seed) => {
  it('goes on, with everything announced and nothing twice', async () => {
    const { child, ended } = desk.start(['measure', 'pattern.plan.yaml']);
    ended.catch(() => {});
    const afterSamples = 1 + stream(seed, 'kill').integer(38);
    const exited = new Promise((resolve) => child.once('exit', resolve));
    for (let tries = 0; tries < 20_000; tries += 1) {
      const count = await announced().catch(() => []);
      if (count.length >= afterSamples) break;
      await new Promise((resolve) => setTimeout(resolve, 1 + stream(seed, `wait ${tries}`).integer(5)));
    }
    child.kill('SIGKILL');
    await exited;
    const before = await announced();
    expect(before.length).toBeGreaterThanOrEqual(afterSamples);
    const kept = await stored();
    expect(kept.map((sample) => sample.sequence)).toEqual(expect.arrayContaining(before));
    const { exitCode, err } = await desk.run(['resume']);
    expect(err).toBe('');
    expect(exitCode).toBe(0);
    const after = await stored();
    expect(positions(after)).toEqual(wanted);
    expect(after.slice(0, kept.length)).toEqual(kept);
  });
});

it('refuses a second process on the same devices with 6, and does not disturb the first', async () => {
  const first = desk.start(['measure', 'pattern.plan.yaml']);
  while ((await announced().catch(() => [])).length === 0)
    await new Promise((resolve) => setTimeout(resolve, 5));
  const second = await desk.run(['measure', desk.path('pattern.plan.yaml')]);
  expect(second.exitCode).toBe(6);
  expect(second.err).toContain('RANGE_HELD');
  expect(second.err).toContain('measure pattern.plan.yaml');
  expect((await first.ended).exitCode).toBe(0);
  expect(positions(await stored())).toEqual(wanted);
});

it('goes on after a stop signal, by number, and refuses a run that is complete or not there', async () => {
  const ended = await desk.run(['measure', desk.path('pattern.plan.yaml')], async (ask) => {
    while ((await announced().catch(() => [])).length < 5)
      await new Promise((resolve) => setTimeout(resolve, 5));
    ask();
  });
  expect(ended.exitCode).toBe(5);
  expect(ended.err).toContain('nightcut resume');
  const resumed = await desk.run(['resume', '1']);
  expect(resumed.err).toBe('');
  expect(resumed.exitCode).toBe(0);
  const again = await desk.run(['resume', '1']);
  expect(again.exitCode).toBe(2);
  expect(again.err).toBe('nightcut: run 1 is complete: there is nothing to go on with\n');
  expect((await desk.run(['resume', '7'])).exitCode).toBe(2);
  expect((await desk.run(['resume'])).exitCode).toBe(2);
});
