// A second way from antenna to antenna, by one reflection at a plane surface: how much longer it is, how strong
// it can be, and what it does to a level. For a check beforehand; nothing here corrects a measurement.
//
//   range antenna ●───────── R ─────────● AUT        a, b: distances from the surface
//                  a ╲               ╱ b             the reflected way is as long as the straight
//   ──────────────────╲─────────────╱───────         one to the mirror image
import { amplitudeDb, amplitudeRatio, lowestLevelDb } from './decibels.ts';
import { wavelengthM } from './friis.ts';
import { finite, PatternError, positive } from './pattern-error.ts';

/** Two antennas before a plane surface, all in m. `alongM` is their distance measured along the surface. */
export interface TwoRays {
  alongM: number;
  firstM: number;
  secondM: number;
}

/**
 * Lengths of the direct and of the reflected way.
 *
 * @param rays distance along the surface and both distances from it, in m, above zero
 * @returns both ways in m
 * Source: geometry (mirror image). Checked: tests/unit/daemon/pattern/echo.test.ts.
 */
export function waysM({ alongM, firstM, secondM }: TwoRays): { directM: number; reflectedM: number } {
  const along = positive('alongM', alongM);
  const [first, second] = [positive('firstM', firstM), positive('secondM', secondM)];
  return { directM: Math.hypot(along, first - second), reflectedM: Math.hypot(along, first + second) };
}

/**
 * How much longer the reflected way is.
 *
 * @param rays as for `waysM`
 * @returns excess path in m
 * Source: geometry, √(R² + (a+b)²) − √(R² + (a−b)²). Checked: tests/unit/daemon/pattern/echo.test.ts.
 */
export function excessPathM(rays: TwoRays): number {
  const { directM, reflectedM } = waysM(rays);
  // The difference of the squares is 4ab: no digits are lost at grazing incidence.
  return (4 * rays.firstM * rays.secondM) / (directM + reflectedM);
}

/**
 * The strongest that the reflected wave can be against the direct one: a perfect mirror, and antennas that
 * look at it as they look at each other. Real ground and antennas with a beam stay below.
 *
 * @param rays as for `waysM`
 * @returns level in dB relative to the direct wave, below 0
 * Source: spherical spreading over both ways. Checked: tests/unit/daemon/pattern/echo.test.ts.
 */
export function strongestEchoDb(rays: TwoRays): number {
  const { directM, reflectedM } = waysM(rays);
  return amplitudeDb(directM / reflectedM);
}

/**
 * What a wave of unknown phase beside the wanted one does to a level.
 *
 * @param echoDb its level relative to the wanted wave in dB, below 0
 * @returns how far the level rises and falls at most, in dB
 * Source: sum of two phasors, 20 log(1 ± a); IEEE Std 149. Checked: tests/outside (C-RIPPLE).
 */
export function rippleDb(echoDb: number): { risesDb: number; fallsDb: number } {
  if (finite('echoDb', echoDb) >= 0) {
    throw new PatternError(`echoDb is ${echoDb}; hand in a level below 0 dB.`, { echoDb });
  }
  const a = amplitudeRatio(echoDb);
  return { risesDb: amplitudeDb(1 + a), fallsDb: Math.max(lowestLevelDb, amplitudeDb(1 - a)) };
}

/**
 * Height between two nulls over reflecting ground: how far the AUT must be moved up or down to see the whole
 * of the ground's effect.
 *
 * @param frequencyHz frequency in Hz
 * @param rangeLengthM range length R in m
 * @param sourceHeightM height of the other antenna in m
 * @returns λR/(2h) in m
 * Source: common practice (two-ray geometry for heights below the range length). Checked: tests/outside (I-HEIGHT).
 */
export function lobingHeightM(frequencyHz: number, rangeLengthM: number, sourceHeightM: number): number {
  const wayM = positive('rangeLengthM', rangeLengthM);
  return (wavelengthM(frequencyHz) * wayM) / (2 * positive('sourceHeightM', sourceHeightM));
}
