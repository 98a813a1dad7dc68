// A whole night in virtual time: reference, then cut after cut for eight hours, through the real drivers on
// in-memory links. The same seed gives the same bytes; another seed does not.
import { afterEach, expect, it } from 'vitest';
import { hashSamples } from '../../daemon/archive/run-hash.ts';
import { runFigures } from '../../daemon/results/run-figures.ts';
import { patternPlan, referencePlan, SimulatedRange } from '../support/simulated-range.ts';

const nightMs = 8 * 3_600_000;
/** Slow, quiet sweeps, as a night allows: three averages at 100 Hz. */
const nightly = patternPlan(['azimuth', 'elevation'])
  .replace('ifBandwidth: 1 kHz', 'ifBandwidth: 100 Hz')
  .replace('averages: 1', 'averages: 3');

const ranges: SimulatedRange[] = [];
afterEach(async () => {
  for (const range of ranges.splice(0)) await range.close();
});

interface Night {
  range: SimulatedRange;
  hashes: string[];
  samples: number;
  hours: number;
}

async function night(seed: number): Promise<Night> {
  const range = new SimulatedRange({
    bench: { scene: { seed, rangeLengthM: 6, drift: { dbPerHour: 0.05, degPerHour: 5, walkDb: 0.02 } } },
  });
  ranges.push(range);
  const hashes: string[] = [];
  let samples = 0;
  const measure = async (plan: string): Promise<void> => {
    const outcome = await range.measure(plan);
    expect(outcome.state).toBe('complete');
    expect(outcome.unconfirmed).toEqual([]);
    const stored = await range.archive.samples(outcome.run.number);
    samples += stored.length;
    hashes.push(hashSamples(stored));
  };
  range.bench.mount('reference');
  await measure(referencePlan);
  range.bench.mount('aut');
  while (range.clock.monotonicMs() < nightMs) await measure(nightly);
  return { range, hashes, samples, hours: range.clock.monotonicMs() / 3_600_000 };
}

it('eight hours pass, and the same seed gives the same bytes', async () => {
  const first = await night(868);
  expect(first.hours).toBeGreaterThan(8);
  expect(first.samples).toBeGreaterThan(3000);
  const second = await night(868);
  expect(second.hashes).toEqual(first.hashes);
  expect(second.samples).toBe(first.samples);
  const document = await runFigures(first.range.archive, first.hashes.length);
  expect(document.state).toBe('complete');
});

it('another seed gives other bytes', async () => {
  const range = (seed: number): SimulatedRange => {
    const made = new SimulatedRange({ bench: { scene: { seed, rangeLengthM: 6 } } });
    ranges.push(made);
    return made;
  };
  const hash = async (seed: number): Promise<string> => {
    const made = range(seed);
    const { run } = await made.measure(referencePlan);
    return hashSamples(await made.archive.samples(run.number));
  };
  expect(await hash(1)).not.toBe(await hash(2));
  expect(await hash(1)).toBe(await hash(1));
});
