// Cuts made for the tests of this folder: by formula, by hand, and arbitrary ones for properties.
import fc from 'fast-check';
import type { Cut } from '../../../../daemon/pattern/cut.ts';

/** A full turn at whole steps from −180 + step to 180, levels by formula of degrees. */
export function turn(levelDb: (deg: number) => number, stepDeg = 1): Cut {
  const count = Math.round(360 / stepDeg);
  const anglesDeg = Float64Array.from({ length: count }, (_, k) => -180 + (k + 1) * stepDeg);
  return { anglesDeg, levelDb: anglesDeg.map(levelDb), periodic: true };
}

/** A part of a turn, both ends included. */
export function part(levelDb: (deg: number) => number, fromDeg: number, toDeg: number, stepDeg = 1): Cut {
  const count = Math.round((toDeg - fromDeg) / stepDeg) + 1;
  const anglesDeg = Float64Array.from({ length: count }, (_, k) => fromDeg + k * stepDeg);
  return { anglesDeg, levelDb: anglesDeg.map(levelDb), periodic: false };
}

export function byHand(anglesDeg: number[], levelDb: number[], periodic = false): Cut {
  return { anglesDeg: Float64Array.from(anglesDeg), levelDb: Float64Array.from(levelDb), periodic };
}

/** A parabola in dB, 3.0103 dB down at half the width on both sides. */
export const parabola =
  (widthDeg: number, peakDeg = 0, peakDb = 0) =>
  (deg: number): number =>
    peakDb - 10 * Math.log10(2) * ((2 * (deg - peakDeg)) / widthDeg) ** 2;

/** Any cut a caller may hand in: 3 to 40 finite levels at ascending angles, a full turn or a part of one. */
export const anyCut: fc.Arbitrary<Cut> = fc
  .record({
    steps: fc.array(fc.double({ min: 1e-3, max: 8, noNaN: true }), { minLength: 2, maxLength: 39 }),
    firstDeg: fc.double({ min: -180, max: 180, noNaN: true }),
    levels: fc.array(
      fc.oneof(
        fc.double({ min: -1000, max: 1000, noNaN: true }),
        fc.double({ min: -40, max: 0, noNaN: true }),
        fc.integer({ min: -3, max: 0 }),
      ),
      { minLength: 40, maxLength: 40 },
    ),
    periodic: fc.boolean(),
  })
  .map(({ steps, firstDeg, levels, periodic }) => {
    const anglesDeg = [firstDeg];
    for (const step of steps) anglesDeg.push(anglesDeg.at(-1)! + step);
    return byHand(anglesDeg, levels.slice(0, anglesDeg.length), periodic);
  });

/** Full turns of 24 to 72 equal steps whose levels are all different, so that no choice is arbitrary. */
export const distinctTurn: fc.Arbitrary<Cut> = fc.integer({ min: 24, max: 72 }).chain((count) =>
  fc
    .uniqueArray(fc.integer({ min: -40_000, max: 0 }), { minLength: count, maxLength: count })
    .map((levels) => {
      const anglesDeg = Float64Array.from({ length: count }, (_, k) => -180 + ((k + 1) * 360) / count);
      return { anglesDeg, levelDb: Float64Array.from(levels, (level) => level / 1000), periodic: true };
    }),
);
