// Match at one frequency: what a reflection coefficient means. Over a band: see match-band.ts.
//
// Symbols: Γ reflection coefficient (S11 at the calibrated plane), Z0 reference impedance, Z = R + jX.
import { amplitudeDb, amplitudeRatio, powerDb } from './decibels.ts';
import { absentFigure, boundFigure, type Figure, type FigureAbsent, valueFigure } from './figure.ts';
import { boundMarginDb } from './floor.ts';
import { finite, PatternError, positive } from './pattern-error.ts';

/** Reference impedance of common coaxial systems. */
export const usualImpedanceOhm = 50;

/** A reflection below this (120 dB down) is no measurement; the return loss is then a lower bound. */
const leastGamma = 1e-6;

/** Why figures of match are absent at |Γ| ≥ 1. */
const tooMuchReflected = 'all of the power comes back, or more: check the calibration and the port';

/** What is said of a reflection that noise alone would show. */
const drownedNote = `the reflection is within ${boundMarginDb} dB of the noise of its measurement`;

/**
 * Return loss of a reflection coefficient.
 *
 * A |Γ| within 3 dB of its noise says only that it is no larger than that mark, wherever it came to lie.
 *
 * @param gammaMagnitude |Γ|, 0 or more
 * @param noise rms amplitude of the noise of Γ, from `meanNoise`, where it is known
 * @returns −20 log|Γ| in dB, positive for a passive load; a lower bound, 3 dB above the noise, for a |Γ|
 *   below that mark; a lower bound of 120 dB below 1e-6
 * @throws PatternError for a negative or non-finite magnitude or noise
 * Source: transmission-line theory; IEEE Std 100 (return loss). Checked: tests/outside (C-MATCH, C-VSWR).
 */
export function returnLossDb(gammaMagnitude: number, noise?: number): Figure {
  const mark = drowningMark(gammaMagnitude, noise);
  if (mark !== undefined) return boundFigure('lower', 0 - amplitudeDb(mark), drownedNote);
  if (magnitude(gammaMagnitude) < leastGamma) return boundFigure('lower', 0 - amplitudeDb(leastGamma));
  return valueFigure(0 - amplitudeDb(gammaMagnitude));
}

/**
 * |Γ| of a return loss.
 *
 * @param lossDb return loss in dB
 * @returns 10^(−loss/20)
 * Source: transmission-line theory. Checked: tests/outside (C-MATCH).
 */
export function gammaOfReturnLoss(lossDb: number): number {
  return amplitudeRatio(0 - finite('lossDb', lossDb));
}

/**
 * Voltage standing wave ratio of a reflection coefficient.
 *
 * @param gammaMagnitude |Γ|, 0 or more
 * @param noise rms amplitude of the noise of Γ, from `meanNoise`, where it is known
 * @returns (1 + |Γ|)/(1 − |Γ|), 1 or more; an upper bound where |Γ| is within 3 dB of the noise, as the
 *   return loss is a lower one; absent at |Γ| of 1 or more
 * @throws PatternError for a negative or non-finite magnitude or noise
 * Source: transmission-line theory. Checked: tests/outside (C-MATCH, C-VSWR).
 */
export function vswr(gammaMagnitude: number, noise?: number): Figure {
  const mark = drowningMark(gammaMagnitude, noise);
  const size = mark ?? gammaMagnitude;
  if (magnitude(size) >= 1) return absentFigure(tooMuchReflected);
  const ratio = (1 + size) / (1 - size);
  return mark === undefined ? valueFigure(ratio) : boundFigure('upper', ratio, drownedNote);
}

/**
 * |Γ| of a voltage standing wave ratio.
 *
 * @param ratio VSWR, 1 or more
 * @returns (VSWR − 1)/(VSWR + 1)
 * @throws PatternError for a ratio below 1
 * Source: transmission-line theory. Checked: tests/outside (C-VSWR).
 */
export function gammaOfVswr(ratio: number): number {
  if (finite('vswr', ratio) < 1) {
    throw new PatternError(`A VSWR of ${ratio}; hand in 1 or more.`, { vswr: ratio });
  }
  return (ratio - 1) / (ratio + 1);
}

/**
 * Mismatch loss: how much less power enters the antenna than the line offers.
 *
 * @param gammaMagnitude |Γ|, 0 or more
 * @returns −10 log(1 − |Γ|²) in dB, 0 or more; absent at |Γ| of 1 or more
 * @throws PatternError for a negative or non-finite magnitude
 * Source: IEEE Std 145 (impedance mismatch factor). Checked: tests/outside (C-MATCH, C-VSWR).
 */
export function mismatchLossDb(gammaMagnitude: number): Figure {
  if (magnitude(gammaMagnitude) >= 1) return absentFigure(tooMuchReflected);
  return valueFigure(0 - powerDb(1 - gammaMagnitude * gammaMagnitude));
}

export interface Impedance {
  kind: 'value';
  resistanceOhm: number;
  reactanceOhm: number;
}

/**
 * Impedance at the calibrated plane.
 *
 * @param re real part of S11
 * @param im imaginary part of S11
 * @param referenceOhm Z0, 50 Ω unless given
 * @returns Z = Z0 (1 + Γ)/(1 − Γ); absent at an open circuit (Γ within 1e-9 of 1)
 * @throws PatternError for numbers that are not finite
 * Source: transmission-line theory. Checked: tests/outside (NEC impedance sweeps).
 */
export function impedance(
  re: number,
  im: number,
  referenceOhm = usualImpedanceOhm,
): Impedance | FigureAbsent {
  const z0 = positive('referenceOhm', referenceOhm);
  const [x, y] = [1 - finite('re', re), finite('im', im)];
  const size = x * x + y * y;
  if (size < 1e-18) return absentFigure('an open circuit: the impedance has no finite value');
  return {
    kind: 'value',
    resistanceOhm: (z0 * (1 - re * re - im * im)) / size,
    reactanceOhm: (z0 * 2 * im) / size,
  };
}

function magnitude(gammaMagnitude: number): number {
  if (finite('gammaMagnitude', gammaMagnitude) >= 0) return gammaMagnitude;
  throw new PatternError(`|Γ| is ${gammaMagnitude}; a magnitude is 0 or more.`, { gammaMagnitude });
}

/** The |Γ| 3 dB above the noise, where the measured one is no larger; undefined where it is, or without noise. */
function drowningMark(gammaMagnitude: number, noise: number | undefined): number | undefined {
  const mark = noise === undefined ? 0 : magnitude(noise) * amplitudeRatio(boundMarginDb);
  return magnitude(gammaMagnitude) <= mark && mark >= leastGamma ? mark : undefined;
}
