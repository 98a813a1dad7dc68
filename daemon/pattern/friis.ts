// Free-space transmission between two antennas, and the gains that follow from it without a reference.
//
// Symbols: G gain in dBi, d distance in m, f frequency in Hz, λ wavelength in m.
import { amplitudeDb, lowestLevelDb } from './decibels.ts';
import { finite, positive } from './pattern-error.ts';

/** Exact by definition of the metre (SI). */
export const speedOfLightMS = 299_792_458;

/**
 * Wavelength in free space.
 *
 * @param frequencyHz above zero
 * @returns λ = c/f in m
 * Checked: tests/outside (I-WAVELENGTH).
 */
export function wavelengthM(frequencyHz: number): number {
  return speedOfLightMS / positive('frequencyHz', frequencyHz);
}

/**
 * Free-space loss between isotropic antennas.
 *
 * @param distanceM distance of the phase centres in m, above zero
 * @param frequencyHz above zero
 * @returns 20 log(4πd/λ) in dB
 * Source: Friis transmission equation; Recommendation ITU-R P.525. Checked: tests/outside (C-FSPL, C-FSPL-CONST).
 */
export function freeSpaceLossDb(distanceM: number, frequencyHz: number): number {
  return amplitudeDb((4 * Math.PI * positive('distanceM', distanceM)) / wavelengthM(frequencyHz));
}

/**
 * Level of S21 between two antennas in the far field of each other.
 *
 * With realized gains this is what an analyzer shows; with IEEE gains the mismatch is left out.
 *
 * @param firstGainDbi gain of one antenna in dBi towards the other
 * @param secondGainDbi gain of the other
 * @param distanceM distance in m
 * @param frequencyHz frequency in Hz
 * @returns 20 log|S21| in dB; add a transmit power in dBm and take off cable losses for a received power
 * Source: Friis transmission equation. Checked: tests/outside (C-FRIIS-1 to C-FRIIS-3).
 */
export function transmissionDb(
  firstGainDbi: number,
  secondGainDbi: number,
  distanceM: number,
  frequencyHz: number,
): number {
  const gainsDb = finite('firstGainDbi', firstGainDbi) + finite('secondGainDbi', secondGainDbi);
  return Math.max(lowestLevelDb, gainsDb - freeSpaceLossDb(distanceM, frequencyHz));
}

/**
 * Sum of two antennas' gains from the transmission between them; half of it for two identical antennas.
 *
 * @param levelDb 20 log|S21| in dB
 * @param distanceM distance in m
 * @param frequencyHz frequency in Hz
 * @returns G1 + G2 in dBi
 * Source: IEEE Std 149 (two-antenna method). Checked: tests/outside (C-2ANT).
 */
export function gainSumDbi(levelDb: number, distanceM: number, frequencyHz: number): number {
  return finite('levelDb', levelDb) + freeSpaceLossDb(distanceM, frequencyHz);
}

/**
 * Gains of three antennas from the three sums of their pairs; no reference is needed.
 *
 * @param abDbi G_a + G_b in dBi, from `gainSumDbi`
 * @param acDbi G_a + G_c
 * @param bcDbi G_b + G_c
 * @returns the gains of a, b and c in dBi
 * Source: IEEE Std 149 (three-antenna method). Checked: tests/outside (C-3ANT).
 */
export function threeAntennaGainsDbi(abDbi: number, acDbi: number, bcDbi: number): [number, number, number] {
  const half = (finite('abDbi', abDbi) + finite('acDbi', acDbi) + finite('bcDbi', bcDbi)) / 2;
  return [half - bcDbi, half - acDbi, half - abDbi];
}
