// A night in which things go wrong, then a quiet end in which the run must finish. The faults are those that
// a run is meant to survive; checkers look at the truth of the bench, not at what the daemon believes.
import { afterEach, describe, expect, it } from 'vitest';
import type { SampleRecord } from '../../daemon/archive/archive.ts';
import type { RunOutcome } from '../../daemon/run/run-loop.ts';
import { drawFaults } from '../../mocks/faults/fault-injector.ts';
import type { Pose } from '../../mocks/scene/pose.ts';
import { homedBoresightDeg, patternPlan, referencePlan, SimulatedRange } from '../support/simulated-range.ts';

/** What a run survives by itself; the others need a person, or a watch that later versions bring. */
const survivable = [
  'positioner-link-drop',
  'lost-ok',
  'late-ok',
  'restart',
  'garbage-status',
  'analyzer-link-drop',
  'garbage-answer',
  'truncated-block',
  'late-answer',
  'hang',
  'power-cycle',
  'nan-block',
];
const faultCount = 12;
const points = 21;
const stepDeg = 3;

interface Night {
  range: SimulatedRange;
  outcome: RunOutcome;
  samples: SampleRecord[];
  /** True poses, every 50 ms of the night. */
  poses: Map<number, Pose>;
}

const ranges: SimulatedRange[] = [];
afterEach(async () => {
  for (const range of ranges.splice(0)) await range.close();
});

async function night(seed: number): Promise<Night> {
  const range = new SimulatedRange({
    bench: { scene: { seed, rangeLengthM: 6, noise: { snrDb: 90 } } },
    homing: 'switch',
    gearPlayDeg: 0.3,
  });
  ranges.push(range);
  range.bench.mount('reference');
  const reference = referencePlan.replace('points: 201', `points: ${points}`);
  expect((await range.measure(reference)).state).toBe('complete');
  range.bench.mount('aut');
  const beginMs = range.clock.monotonicMs();
  const plan = drawFaults(seed, {
    count: faultCount,
    fromMs: beginMs + 5_000,
    toMs: beginMs + 400_000,
    names: survivable,
  });
  range.bench.faults.follow(plan);
  const poses = new Map<number, Pose>();
  let going = true;
  const look = (): void => {
    const nowMs = range.clock.monotonicMs();
    poses.set(nowMs, range.bench.controller.poseAt(nowMs));
    if (going) range.clock.at(nowMs + 50, look);
  };
  look();
  const outcome = await range.measure(patternPlan(['azimuth', 'elevation'], { points, stepDeg }));
  going = false;
  return { range, outcome, samples: await range.archive.samples(outcome.run.number), poses };
}

describe.each([1, 2, 3, 4, 5, 6])('a night of faults, seed %i', (seed) => {
  it('is finished, with every angle once and nothing false in it', async () => {
    const { range, outcome, samples, poses } = await night(seed);
    if (outcome.error) console.info(seed, outcome.error, JSON.stringify(range.bench.faults.journal));
    expect(outcome.error).toBeUndefined();
    // A late one may come after the end.
    expect(range.bench.faults.journal.length).toBeGreaterThan(faultCount / 2);
    expect(outcome.state).toBe('complete');
    expectEveryAngleOnce(samples);
    expectTrueAngles(range, samples);
    expectTrueTraces(range, samples);
    expectWithinTravel(poses);
    // Motors still and source off at the end.
    expect(outcome.unconfirmed).toEqual([]);
    expect(range.bench.controller.state).toBe('Idle');
    expect(range.bench.instrument.settings.outputOn).toBe(false);
  });
});

function expectEveryAngleOnce(samples: readonly SampleRecord[]): void {
  const taken = samples
    .filter((sample) => sample.purpose !== 'tie')
    .map((sample) => `${sample.cut} ${sample.purpose} ${sample.angleDeg}`);
  const turn = Array.from({ length: 360 / stepDeg + 1 }, (_, i) => i * stepDeg - 180);
  const wanted = ['azimuth', 'elevation'].flatMap((cut) =>
    turn.map((angleDeg) => `${cut} ${angleDeg === 180 ? 'closure' : 'cut'} ${angleDeg}`),
  );
  expect([...taken].sort()).toEqual([...wanted].sort());
  expect(samples.map((sample) => sample.sequence)).toEqual(samples.map((_, index) => index + 1));
}

/** Invariant 3: taken at rest, with the axes where the record says. */
function expectTrueAngles(range: SimulatedRange, samples: readonly SampleRecord[]): void {
  for (const sample of samples) {
    const wanted = {
      azimuthDeg: sample.target['azimuth']! - homedBoresightDeg,
      elevationDeg: sample.target['elevation']! - homedBoresightDeg,
    };
    for (const ms of [sample.startMonotonicMs, sample.stopMonotonicMs]) {
      const pose = range.bench.controller.poseAt(ms);
      expect(Math.abs(pose.azimuthDeg - wanted.azimuthDeg), `azimuth of ${sample.sequence}`).toBeLessThan(
        0.05,
      );
      expect(
        Math.abs(pose.elevationDeg - wanted.elevationDeg),
        `elevation of ${sample.sequence}`,
      ).toBeLessThan(0.05);
    }
  }
}

/** What was stored is what the scene gives at that pose; noise is 90 dB down. */
function expectTrueTraces(range: SimulatedRange, samples: readonly SampleRecord[]): void {
  for (const sample of samples) {
    const trace = sample.traces.get('S21')!;
    expect(trace).toHaveLength(2 * points);
    const pose = range.bench.controller.poseAt(sample.startMonotonicMs);
    const boresight = { azimuthDeg: 0, elevationDeg: 0, rollDeg: 0 };
    for (const [k, hz] of [820e6, 870e6, 920e6].entries()) {
      const at = k * ((points - 1) / 2);
      const truth = range.bench.scene.s('S21', hz, sample.startMonotonicMs, pose);
      const top = range.bench.scene.s('S21', 868e6, sample.startMonotonicMs, boresight);
      const away = Math.hypot(trace[2 * at]! - truth.re, trace[2 * at + 1]! - truth.im);
      // 5 standard deviations of the noise, and the read-back's hundredth of a degree.
      expect(away / Math.hypot(top.re, top.im), `trace of ${sample.sequence}`).toBeLessThan(3e-3);
    }
  }
}

/** Invariant 1, by the truth: the shaft never left its travel, not even on the way to the home switch. */
function expectWithinTravel(poses: ReadonlyMap<number, Pose>): void {
  for (const [ms, pose] of poses) {
    expect(Math.abs(pose.azimuthDeg), `azimuth at ${ms} ms`).toBeLessThan(201);
    expect(Math.abs(pose.elevationDeg), `elevation at ${ms} ms`).toBeLessThan(201);
  }
}
