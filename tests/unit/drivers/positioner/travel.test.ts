import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { isDriverError } from '../../../../drivers/errors.ts';
import type { AxisSetup } from '../../../../drivers/positioner/positioner.ts';
import {
  checkTarget,
  legMotion,
  motionLine,
  motionSeconds,
  planLegs,
  reachableDeg,
} from '../../../../drivers/positioner/travel.ts';

const azimuth: AxisSetup = {
  name: 'azimuth',
  word: 'X',
  unitsPerDegree: 1,
  travelMinDeg: -190,
  travelMaxDeg: 190,
  rateDegPerS: 30,
  accelerationDegPerS2: 60,
  approachFrom: 'below',
  approachDeg: 2,
  settleMs: 0,
  toleranceDeg: 0.05,
  homing: 'none',
};
const elevation: AxisSetup = {
  ...azimuth,
  name: 'elevation',
  word: 'Y',
  approachFrom: 'above',
  travelMinDeg: -10,
  travelMaxDeg: 90,
};
const at = (deg: number, takenUp = false): { azimuth: { deg: number; takenUp: boolean } } => ({
  azimuth: { deg, takenUp },
});

describe('planLegs', () => {
  it.each([
    ['a long way from the side: one leg', at(-50), 10, [{ azimuth: 10 }]],
    ['from the other side: past the target and back', at(50), 10, [{ azimuth: 8 }, { azimuth: 10 }]],
    ['a short way, play unknown: back first', at(9), 10, [{ azimuth: 8 }, { azimuth: 10 }]],
    ['a short way, play taken up: one leg', at(9, true), 10, [{ azimuth: 10 }]],
    ['there already: nothing', at(10, true), 10, []],
    ['there, play unknown: back and again', at(10), 10, [{ azimuth: 8 }, { azimuth: 10 }]],
  ])('%s', (_what, stands, target, legs) => {
    expect(planLegs([azimuth], stands, { azimuth: target })).toEqual(legs);
  });

  it('leaves and comes back when asked to', () => {
    expect(planLegs([azimuth], at(10, true), { azimuth: 10 }, true)).toEqual([
      { azimuth: 8 },
      { azimuth: 10 },
    ]);
  });

  it('comes from above where the range says so, and leaves the other axis its straight way', () => {
    const stands = { azimuth: { deg: -50, takenUp: false }, elevation: { deg: 0, takenUp: false } };
    expect(planLegs([azimuth, elevation], stands, { azimuth: 0, elevation: 30 })).toEqual([
      { azimuth: 0, elevation: 32 },
      { elevation: 30 },
    ]);
  });

  it('makes no detour where the approach is switched off', () => {
    expect(planLegs([{ ...azimuth, approachDeg: 0 }], at(50), { azimuth: 10 })).toEqual([{ azimuth: 10 }]);
  });

  it('refuses what cannot be reached from its side within travel', () => {
    expect(reachableDeg(azimuth)).toEqual({ minDeg: -188, maxDeg: 190 });
    expect(reachableDeg(elevation)).toEqual({ minDeg: -10, maxDeg: 88 });
    for (const target of [
      { azimuth: -188.001 },
      { azimuth: 190.001 },
      { elevation: 89 },
      { roll: 0 },
      { azimuth: Number.NaN },
    ]) {
      let thrown: unknown;
      try {
        checkTarget([azimuth, elevation], target);
      } catch (error) {
        thrown = error;
      }
      expect(isDriverError(thrown, 'POSITIONER_OUTSIDE_TRAVEL'), JSON.stringify(target)).toBe(true);
    }
  });

  it('ends every plan at the target, the last stretch from the side, inside travel', () => {
    const deg = fc.double({ min: -190, max: 190, noNaN: true });
    fc.assert(
      fc.property(
        deg,
        deg,
        fc.boolean(),
        fc.boolean(),
        fc.constantFrom('below' as const, 'above' as const),
        (from, target, takenUp, through, side) => {
          const axis = { ...azimuth, approachFrom: side };
          const { minDeg, maxDeg } = reachableDeg(axis);
          fc.pre(target >= minDeg && target <= maxDeg);
          const legs = planLegs([axis], at(from, takenUp), { azimuth: target }, through);
          let before = from;
          for (const leg of legs) {
            expect(Math.abs(leg['azimuth']!)).toBeLessThanOrEqual(190);
            const isLast = leg === legs.at(-1);
            if (isLast) {
              const stretch = (side === 'below' ? 1 : -1) * (leg['azimuth']! - before);
              expect(stretch).toBeGreaterThan(takenUp && !through ? 0 : 2 - 1e-9);
            }
            before = leg['azimuth']!;
          }
          if (legs.length > 0) expect(before).toBe(target);
          else expect(takenUp && !through).toBe(true);
        },
      ),
    );
  });
});

describe('motion time and feed', () => {
  it('follows the trapezoid and, for short ways, the triangle', () => {
    // 90° at 30°/s and 60°/s²: 0.5 s up (7.5°), 75° at rate (2.5 s), 0.5 s down.
    expect(motionSeconds(90, 30, 60)).toBeCloseTo(3.5, 12);
    expect(motionSeconds(-15, 30, 60)).toBeCloseTo(1, 12);
    expect(motionSeconds(0.6, 30, 60)).toBeCloseTo(0.2, 12);
    expect(motionSeconds(0, 30, 60)).toBe(0);
  });

  it('keeps each axis at or below its own rate along the common line', () => {
    const slow = { ...elevation, rateDegPerS: 3, accelerationDegPerS2: 60 };
    const { feedUnitsPerMin, seconds } = legMotion(
      [azimuth, slow],
      {},
      { azimuth: 0, elevation: 0 },
      { azimuth: 30, elevation: 40 },
    );
    // 40° at 3°/s govern: 13.33 s; the line is 50 units long.
    expect(feedUnitsPerMin).toBeCloseTo((50 / (40 / 3)) * 60, 9);
    expect(seconds).toBeCloseTo(40 / 3 + 3 / 60, 9);
  });

  it.each([0, 5e-324, 1e-300, 1e-12])('gives %f° of way no duration, and a feed all the same', (wayDeg) => {
    const { feedUnitsPerMin, seconds } = legMotion([azimuth], {}, { azimuth: 0 }, { azimuth: wayDeg });
    expect(seconds).toBe(0);
    expect(feedUnitsPerMin).toBeGreaterThan(0);
    expect(Number.isFinite(feedUnitsPerMin)).toBe(true);
  });
});

describe('motionLine', () => {
  it('writes fixed notation with the modes, in machine coordinates', () => {
    expect(motionLine([azimuth, elevation], { azimuth: 1e-7, elevation: 12.34567 }, 1800)).toBe(
      'G21 G90 G94 G53 G1 X0 Y12.3457 F1800',
    );
    expect(motionLine([{ ...azimuth, unitsPerDegree: -100 }], { azimuth: 123.45678 }, 99999.123)).toBe(
      'G21 G90 G94 G53 G1 X-12345.678 F99999.123',
    );
  });

  it('never leads outside travel, neither asked to nor by rounding', () => {
    expect(() => motionLine([azimuth], { azimuth: 190.00001 }, 100)).toThrow(/leave its travel/);
    fc.assert(
      fc.property(
        fc.double({ min: 0.001, max: 400, noNaN: true }),
        fc.double({ min: 0.02, max: 300, noNaN: true }),
        fc.boolean(),
        (maxDeg, scale, turned) => {
          const axis = {
            ...azimuth,
            unitsPerDegree: turned ? -scale : scale,
            travelMinDeg: -maxDeg,
            travelMaxDeg: maxDeg,
          };
          for (const target of [maxDeg, -maxDeg]) {
            const text = / X(-?\d+(?:\.\d+)?) /.exec(motionLine([axis], { azimuth: target }, 60))![1]!;
            expect(text.replace(/[-.]/g, '').length).toBeLessThanOrEqual(8);
            expect(Math.abs(Number(text) / scale)).toBeLessThanOrEqual(maxDeg * (1 + 1e-12));
          }
        },
      ),
    );
  });
});
