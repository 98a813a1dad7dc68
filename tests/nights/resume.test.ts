// A run that is stopped at any moment and resumed ends with the same positions as one that was not, each once,
// and every sample that was announced is still there, unaltered.
import { afterEach, describe, expect, it } from 'vitest';
import type { SampleRecord } from '../../daemon/archive/archive.ts';
import { hashSamples } from '../../daemon/archive/run-hash.ts';
import { runFigures } from '../../daemon/results/run-figures.ts';
import { stream } from '../../mocks/random.ts';
import { patternPlan, SimulatedRange } from '../support/simulated-range.ts';

const plan = patternPlan(['azimuth'], { gainReference: 'none', points: 21, stepDeg: 5 });

const ranges: SimulatedRange[] = [];
afterEach(async () => {
  for (const range of ranges.splice(0)) await range.close();
});

function newRange(homing: 'switch' | 'none'): SimulatedRange {
  const range = new SimulatedRange({
    bench: { scene: { seed: 3, rangeLengthM: 6 } },
    homing,
    gearPlayDeg: 0.2,
  });
  ranges.push(range);
  return range;
}

function positions(samples: readonly SampleRecord[]): string[] {
  return samples
    .filter((sample) => sample.purpose === 'cut' || sample.purpose === 'closure')
    .map((sample) => `${sample.cut} ${sample.purpose} ${sample.angleDeg}`)
    .sort();
}

describe.each(['switch', 'none'] as const)('a run with homing %s, stopped at any moment', (homing) => {
  it('goes on where it stopped and misses and doubles nothing', async () => {
    const whole = newRange(homing);
    const uninterrupted = await whole.measure(plan);
    const wanted = positions(await whole.archive.samples(uninterrupted.run.number));
    const random = stream(11, homing);
    for (let round = 0; round < 12; round += 1) {
      const range = newRange(homing);
      const stopAfterMs = random.uniform(1000, 70_000);
      const first = await range.measure(plan, (event, stop) => {
        if (event.kind === 'segment')
          range.clock.at(range.clock.monotonicMs() + stopAfterMs, () => stop.abort());
      });
      if (first.state === 'complete') continue;
      expect(first.state).toBe('interrupted');
      const before = await range.archive.samples(first.run.number);
      const second = await range.resume();
      expect(second.error, `stopped after ${stopAfterMs} ms`).toBeUndefined();
      expect(second.run).toEqual(first.run);
      const after = await range.archive.samples(first.run.number);
      expect(hashSamples(after.slice(0, before.length))).toBe(hashSamples(before));
      expect(positions(after)).toEqual(wanted);
      expect(after.map((sample) => sample.sequence)).toEqual(after.map((_, index) => index + 1));
      const document = await runFigures(range.archive, first.run.number);
      expect(document.state).toBe('complete');
      expect(document.cuts[0]?.anglesDeg).toHaveLength(72);
    }
  });
});

it('repeats the last positions and tells what they differ by', async () => {
  const range = newRange('switch');
  await range.measure(plan, (event, stop) => {
    if (event.kind === 'sample' && event.sample.angleDeg === -100) stop.abort();
  });
  range.bench.controller.loseSteps('X', 0.01);
  const resumed = await range.resume();
  const samples = await range.archive.samples(resumed.run.number);
  const repeats = samples.filter((sample) => sample.purpose === 'repeat');
  expect(repeats).toHaveLength(2);
  expect(repeats.every((sample) => sample.segment === 2)).toBe(true);
  const notes = (await range.archive.events(resumed.run.number)).filter((event) => event.kind === 'repeat');
  expect(notes).toHaveLength(2);
  for (const note of notes) expect(Math.abs(Number(note.facts['differenceDb']))).toBeLessThan(0.5);
});

it('flags a slip that happened in between, with its size', async () => {
  const range = newRange('none');
  await range.measure(plan, (event, stop) => {
    if (event.kind === 'sample' && event.sample.angleDeg === -60) stop.abort();
  });
  // Somebody leaned on the boom: 8° of slip that no counter sees.
  range.bench.controller.loseSteps('X', 8);
  const { run } = await range.resume();
  const { flags } = await runFigures(range.archive, run.number);
  expect(flags.map((flag) => flag.code)).toContain('REPEAT_DIFFERS');
});

it('refuses what cannot go on', async () => {
  const range = newRange('none');
  await expect(range.resume()).rejects.toMatchObject({ code: 'RUN_NOT_RESUMABLE' });
  await range.measure(plan);
  await expect(range.resume()).rejects.toMatchObject({ code: 'RUN_NOT_RESUMABLE' });
});

it('does not believe the count of an axis without a switch after a restart in between', async () => {
  const range = newRange('none');
  await range.measure(plan, (event, stop) => {
    if (event.kind === 'sample' && event.sample.angleDeg === -100) stop.abort();
  });
  range.bench.controller.restart();
  await expect(range.resume()).rejects.toMatchObject({ code: 'POSITIONER_REFERENCE_LOST' });
});
