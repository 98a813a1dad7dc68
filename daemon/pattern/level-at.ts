// The level of a cut at any angle, between its samples: gain at an angle, front-to-back, sector edges.
import type { Cut } from './cut.ts';
import { absentFigure, type Figure, valueFigure } from './figure.ts';
import { finite } from './pattern-error.ts';

/**
 * Level at an angle, linear in dB between the two samples beside it.
 *
 * Whole turns do not matter: 270° and −90° are one direction. Linear in dB needs no phase, and on a lobe
 * sampled at a tenth of its width it is within 0.01 dB; across a deep null it reads between the samples.
 *
 * @param cut levels in dB over degrees
 * @param angleDeg pattern angle in degrees
 * @returns the level in dB; absent outside a cut that is no full turn
 * @throws PatternError for a non-finite angle
 * Source: common practice, no source; the same interpolation as for beamwidths.
 * Checked: tests/outside (A-DIP-HALF-PTS, A-CHEB10-PTS).
 */
export function levelAt(cut: Cut, angleDeg: number): Figure {
  const { anglesDeg, levelDb } = cut;
  const count = anglesDeg.length;
  const firstDeg = anglesDeg[0]!;
  const turns = Math.floor((finite('angleDeg', angleDeg) - firstDeg) / 360);
  const placedDeg = angleDeg - 360 * turns;
  const lastDeg = anglesDeg[count - 1]!;
  if (placedDeg > lastDeg && !cut.periodic) {
    const nearEnd = placedDeg - lastDeg <= 1e-9 || firstDeg + 360 - placedDeg <= 1e-9;
    if (!nearEnd) {
      return absentFigure(
        `the cut from ${round(firstDeg)}° to ${round(lastDeg)}° does not reach ${round(angleDeg)}°`,
      );
    }
    return valueFigure(placedDeg - lastDeg <= 1e-9 ? levelDb[count - 1]! : levelDb[0]!);
  }
  const below = lastAtOrBelow(anglesDeg, placedDeg);
  const wraps = below === count - 1;
  if (wraps && !cut.periodic) return valueFigure(levelDb[below]!);
  const nextDeg = wraps ? firstDeg + 360 : anglesDeg[below + 1]!;
  const nextDb = wraps ? levelDb[0]! : levelDb[below + 1]!;
  const share = (placedDeg - anglesDeg[below]!) / (nextDeg - anglesDeg[below]!);
  return valueFigure(levelDb[below]! * (1 - share) + nextDb * share);
}

function lastAtOrBelow(anglesDeg: Float64Array, angleDeg: number): number {
  let low = 0;
  let high = anglesDeg.length - 1;
  while (low < high) {
    const middle = (low + high + 1) >> 1;
    if (anglesDeg[middle]! <= angleDeg) low = middle;
    else high = middle - 1;
  }
  return low;
}

function round(angleDeg: number): number {
  return Number(angleDeg.toFixed(2));
}
