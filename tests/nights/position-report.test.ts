// Whole runs on a controller of the position-report family: a clean one, one that an operator stops in mid-move,
// and one with faults on both devices. What a night promises does not depend on the family.
import { afterEach, describe, expect, it } from 'vitest';
import { runFigures } from '../../daemon/results/run-figures.ts';
import { drawFaults } from '../../mocks/faults/fault-injector.ts';
import type { ReportControllerOptions } from '../../mocks/positioner-report/report-controller.ts';
import { homedBoresightDeg, patternPlan, SimulatedRange } from '../support/simulated-range.ts';

const plan = patternPlan(['azimuth'], { gainReference: 'none', points: 21, stepDeg: 5 });
const anglesDeg = Array.from({ length: 73 }, (_, i) => i * 5 - 180);

const ranges: SimulatedRange[] = [];
afterEach(async () => {
  for (const range of ranges.splice(0)) await range.close();
});

function newRange(
  homing: 'switch' | 'none',
  seed = 3,
  options: ReportControllerOptions = {},
): SimulatedRange {
  const perAxis = [0, 1, 2].flatMap((axis): [number, number][] => [
    [110 + axis, 1200],
    [120 + axis, 40],
    [130 + axis, 400],
  ]);
  const axis = { playUnits: 0.2, ...(homing === 'switch' ? { switchUnits: 200 } : {}) };
  const range = new SimulatedRange({
    bench: {
      scene: { seed, rangeLengthM: 6 },
      positioner: {
        family: 'position-report',
        settings: Object.fromEntries(perAxis),
        mechanics: { X: axis, Y: axis },
        ...options,
      },
    },
    homing,
  });
  ranges.push(range);
  return range;
}

/** Every angle once, and the shaft truly there at both ends of each sample. */
async function expectTrueRun(range: SimulatedRange, run: number, boresightDeg: number): Promise<void> {
  const samples = (await range.archive.samples(run)).filter((sample) =>
    ['cut', 'closure'].includes(sample.purpose),
  );
  expect(samples.map((sample) => sample.angleDeg).sort((a, b) => a - b)).toEqual(anglesDeg);
  for (const sample of samples) {
    for (const ms of [sample.startMonotonicMs, sample.stopMonotonicMs]) {
      const azimuthDeg = range.bench.controller.poseAt(ms).azimuthDeg + boresightDeg;
      expect(Math.abs(azimuthDeg - sample.target['azimuth']!)).toBeLessThan(0.05);
    }
  }
}

it.each([
  ['every option', {}],
  ['no option', { emergencyParser: false, truePositions: false, chatty: true }],
])('a clean run, on a build with %s', async (_, build) => {
  const range = newRange('none', 3, build);
  const outcome = await range.measure(plan);
  expect(outcome.error).toBeUndefined();
  expect(outcome.state).toBe('complete');
  expect(outcome.unconfirmed).toEqual([]);
  await expectTrueRun(range, outcome.run.number, 0);
  expect((await runFigures(range.archive, outcome.run.number)).flags).toEqual([]);
});

/** Stops the run while the azimuth turns, at about −100°. */
async function stopInMidMove(range: SimulatedRange) {
  const interrupted = await range.measure(plan, (event, stop) => {
    if (event.kind !== 'sample' || event.sample.angleDeg !== -100) return;
    const whenMoving = (): void => {
      if (range.bench.controller.state === 'Run') stop.abort();
      else range.clock.at(range.clock.monotonicMs() + 20, whenMoving);
    };
    whenMoving();
  });
  expect(interrupted.state).toBe('interrupted');
  expect(interrupted.unconfirmed).toEqual([]);
  expect(range.bench.controller.state).toBe('Idle');
  return interrupted;
}

it('is stopped in mid-move and goes on, homed anew', async () => {
  const range = newRange('switch');
  await stopInMidMove(range);
  const resumed = await range.resume();
  expect(resumed.error).toBeUndefined();
  expect(resumed.state).toBe('complete');
  await expectTrueRun(range, resumed.run.number, homedBoresightDeg);
});

it('is not believed after a stop in mid-move where there is no home switch', async () => {
  const range = newRange('none');
  await stopInMidMove(range);
  await expect(range.resume()).rejects.toMatchObject({ code: 'POSITIONER_REFERENCE_LOST' });
});

/** A halt is none of them: it needs a person. */
const survivable = ['positioner-link-drop', 'lost-ok', 'late-ok', 'restart', 'garbage-status'];

describe.each([1, 2, 3, 4])('a run with faults, seed %i', (seed) => {
  it('is finished, with every angle once and nothing false in it', async () => {
    // A link that is lost in homing ends in a stop, and that in a halt: only a board that is reset by opening its
    // link comes back without a person.
    const range = newRange('switch', seed, { onConnect: 'restarts' });
    const beginMs = range.clock.monotonicMs();
    range.bench.faults.follow(
      drawFaults(seed, { count: 12, fromMs: beginMs + 5_000, toMs: beginMs + 200_000, names: survivable }),
    );
    const outcome = await range.measure(plan);
    if (outcome.error) console.info(seed, outcome.error, JSON.stringify(range.bench.faults.journal));
    expect(outcome.error).toBeUndefined();
    expect(range.bench.faults.journal.length).toBeGreaterThan(6);
    await expectTrueRun(range, outcome.run.number, homedBoresightDeg);
  });
});
