// Closure of a full turn: how far the last sample, taken where the first was, has moved away from it. Tells
// of drift, slip and backlash between the two; which of them it was, it cannot tell.
import { wrapDeg } from './angles.ts';
import { amplitudeDb, lowestLevelDb } from './decibels.ts';
import { absentFigure, type Figure, valueFigure } from './figure.ts';
import { PatternError } from './pattern-error.ts';

export interface Closure {
  /** Last minus first, in dB. */
  levelDb: Figure;
  /** Last minus first, in degrees, wrapped to (−180, 180]. */
  phaseDeg: Figure;
}

/**
 * Closure of a full turn at N frequencies.
 *
 * @param first complex trace of the first sample, interleaved re, im, length 2N
 * @param last complex trace of the sample at the end of the turn, same shape
 * @returns N closures; absent where one of the two samples is exactly zero
 * @throws PatternError for traces of different length or numbers that are not finite
 * Method: level and phase of the ratio last/first. Common practice, no source.
 * Checked: tests/unit/daemon/pattern/closure.test.ts.
 */
export function closure(first: Float64Array, last: Float64Array): Closure[] {
  if (first.length !== last.length || first.length % 2 !== 0) {
    throw new PatternError('First and last trace differ in length; hand in two traces of one setting.', {
      first: first.length,
      last: last.length,
    });
  }
  return Array.from({ length: first.length / 2 }, (_, k) =>
    closureOfPair(first[2 * k]!, first[2 * k + 1]!, last[2 * k]!, last[2 * k + 1]!),
  );
}

/**
 * Closure of level-only samples.
 *
 * @param firstDb level of the first sample in dB
 * @param lastDb level of the last in dB
 * @returns the difference; the phase is absent
 */
export function levelClosure(firstDb: number, lastDb: number): Closure {
  return {
    levelDb: valueFigure(lastDb - firstDb),
    phaseDeg: absentFigure('the cut holds levels without phase'),
  };
}

function closureOfPair(firstRe: number, firstIm: number, lastRe: number, lastIm: number): Closure {
  const firstDb = amplitudeDb(Math.hypot(firstRe, firstIm));
  const lastDb = amplitudeDb(Math.hypot(lastRe, lastIm));
  if (firstDb === lowestLevelDb || lastDb === lowestLevelDb) {
    const because = `the ${firstDb === lowestLevelDb ? 'first' : 'last'} sample of the turn is zero`;
    return { levelDb: absentFigure(because), phaseDeg: absentFigure(because) };
  }
  const turnDeg = ((Math.atan2(lastIm, lastRe) - Math.atan2(firstIm, firstRe)) * 180) / Math.PI;
  return { levelDb: valueFigure(lastDb - firstDb), phaseDeg: valueFigure(wrapDeg(turnDeg)) };
}
