// By hand: two tied samples 10° apart with the axes of the plan's helper. Ties and samples: tie 0°, −5°, 5°, tie.
// 101 points at 1 kHz sweep in 101 ms.
import { describe, expect, it } from 'vitest';
import { moveMs } from '../../../../../daemon/plan/duration.ts';
import { expandPlan } from '../../../../../daemon/plan/expand.ts';
import { checkDuration, nightLength } from '../../../../../daemon/plan/preflight/night-length.ts';
import { axis, cut } from '../planned.ts';
import { night, site } from './site.ts';

const two = night({ cuts: [cut({ fromDeg: -5, toDeg: 5, stepDeg: 10 })] });
const still = { ...axis(), approachDeg: 0, settleMs: 0 };
const place = site({ positioner: { ...site().positioner, axes: [still] } });

describe('the length of the night', () => {
  it('is motion and sweeps, and ends that much later', () => {
    const run = expandPlan(two, place);
    expect(run.steps.map((step) => step.target['azimuth'])).toEqual([0, -5, 5, 0]);
    const length = nightLength(run, two, place, 1_000_000);
    const motionMs = moveMs(still, 0, -5) + moveMs(still, -5, 5) + moveMs(still, 5, 0);
    // 5° in 2·√(5/40) s or at full rate in 0.25 + 0.5 s, which is the longer way: v²/a = 10°.
    expect(motionMs).toBeCloseTo(2 * 2000 * Math.sqrt(5 / 40) + 2000 * Math.sqrt(10 / 40), 6);
    expect(length.durationMs).toBeCloseTo(motionMs + 4 * 101, 6);
    expect(length.endWallMs).toBeCloseTo(1_000_000 + length.durationMs, 6);
  });

  it('counts averages, and ties twice where the match needs the other port', () => {
    const run = expandPlan(two, place);
    const base = nightLength(run, two, place, 0).durationMs;
    const averaged = { ...two, analyzer: { ...two.analyzer, averages: 3 } };
    expect(nightLength(run, averaged, place, 0).durationMs - base).toBeCloseTo(2 * 4 * 101, 6);
    const other = { ...place, analyzer: { ...place.analyzer, autPort: 2 as const } };
    expect(nightLength(run, two, other, 0).durationMs - base).toBeCloseTo(2 * 101, 6);
  });

  it('of more than twelve hours is warned of', () => {
    const hours = (count: number) => checkDuration({ durationMs: count * 3_600_000, endWallMs: 0 });
    expect(hours(12)).toMatchObject({ verdict: 'go' });
    expect(hours(12).text).toContain('at least 12.0 h');
    expect(hours(12.1)).toMatchObject({ verdict: 'caution' });
  });
});
