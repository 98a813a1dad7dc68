// Expected values by hand from constant acceleration: with 20 deg/s and 40 deg/s² an axis is at full rate
// after 0.5 s and 5 deg, so that 10 deg take 1 s, 100 deg take 4.5 s + 1 s, and 2 deg take 2·√(2/40) s.
import { describe, expect, it } from 'vitest';
import { moveMs, predictDurationMs, predictStepsMs, timeLeftMs } from '../../../../daemon/plan/duration.ts';
import { expandPlan, type PlannedStep } from '../../../../daemon/plan/expand.ts';
import { axis, cut, elevation, plan, range } from './planned.ts';

const twoDegreesMs = 2 * Math.sqrt(2 / 40) * 1000;

function to(...degs: number[]): PlannedStep[] {
  return degs.map((deg) => ({
    purpose: 'cut',
    cut: '',
    axis: 'azimuth',
    angleDeg: deg,
    target: { azimuth: deg, elevation: 0 },
    component: 'co',
  }));
}

describe('a move', () => {
  it.each([
    [0, 10, 1000],
    [0, 100, 5500],
    [100, 0, 5500],
    [0, 2, twoDegreesMs],
    [3, 3, 0],
  ])('from %d to %d takes %d ms', (from, end, ms) => {
    expect(moveMs(axis(), from, end)).toBeCloseTo(ms, 6);
  });
});

describe('the steps of a run', () => {
  it('take one move ahead, two back, none to where the axes stand', () => {
    const axes = [axis(), elevation()];
    const from = { azimuth: 0, elevation: 0 };
    const [ahead, there, back, short] = predictStepsMs(to(100, 100, 2, 4), axes, 300, from);
    expect(ahead).toBeCloseTo(5500 + 200 + 300, 6);
    expect(there).toBe(300);
    // 100 deg down to the approach start at 0, then 2 deg up.
    expect(back).toBeCloseTo(5500 + twoDegreesMs + 200 + 300, 6);
    expect(short).toBeCloseTo(twoDegreesMs + 200 + 300, 6);
  });

  it('wait for the slowest axis', () => {
    const axes = [axis(), elevation({ settleMs: 9000 })];
    const [ms] = predictStepsMs([{ ...to(10)[0]!, target: { azimuth: 10, elevation: 10 } }], axes, 0, {
      azimuth: 0,
      elevation: 0,
    });
    expect(ms).toBeCloseTo(1000 + 9000, 6);
  });

  it('mirror where the approach is from above, and need no detour where there is no backlash', () => {
    const from = { azimuth: 100, elevation: 0 };
    const above = [axis({ approachFrom: 'above' })];
    expect(predictStepsMs(to(0), above, 0, from)[0]).toBeCloseTo(5700, 6);
    expect(predictStepsMs(to(0), [axis({ approachDeg: 0 })], 0, from)[0]).toBeCloseTo(5700, 6);
  });

  it('add up, and to the time left', () => {
    const { steps } = expandPlan(plan({ cuts: [cut({ fromDeg: 0, toDeg: 4, stepDeg: 2 })] }), range(axis()));
    const stepsMs = predictStepsMs(steps, [axis()], 1000);
    // Approach to the first tie; 0 is there; 2 and 4; back to the tie by 6 deg and 2 deg.
    const expected = [twoDegreesMs + 1200, 1000, twoDegreesMs + 1200, twoDegreesMs + 1200];
    expected.push(2 * Math.sqrt(6 / 40) * 1000 + twoDegreesMs + 1200);
    for (const [i, ms] of expected.entries()) expect(stepsMs[i]).toBeCloseTo(ms, 6);
    const total = expected.reduce((sum, ms) => sum + ms, 0);
    expect(predictDurationMs(steps, [axis()], 1000)).toBeCloseTo(total, 6);
    expect(timeLeftMs(stepsMs, 4)).toBeCloseTo(expected[4]!, 6);
    expect(timeLeftMs(stepsMs, 5)).toBe(0);
  });
});
