// How far apart antennas must stand for a pattern to be that of the far field, and what is left of the wave's
// curvature when they stand nearer.
import { wavelengthM } from './friis.ts';
import { positive } from './pattern-error.ts';

/**
 * Far-field distance 2D²/λ.
 *
 * For antennas smaller than about half a wavelength it is shorter than a wavelength, and some wavelengths of
 * distance are the stronger demand; that is the caller's to weigh.
 *
 * @param sizeM largest dimension D of the antenna in m
 * @param frequencyHz frequency in Hz
 * @returns distance in m; there the phase at the edge is 22.5° late
 * Source: IEEE Std 149; Balanis, Antenna Theory, section on field regions. Checked: tests/outside (C-FAR).
 */
export function farFieldDistanceM(sizeM: number, frequencyHz: number): number {
  return (2 * positive('sizeM', sizeM) ** 2) / wavelengthM(frequencyHz);
}

/**
 * Outer limit of the reactive near field, 0.62 √(D³/λ).
 *
 * @param sizeM largest dimension D of the antenna in m
 * @param frequencyHz frequency in Hz
 * @returns distance in m
 * Source: Balanis, Antenna Theory, section on field regions. Checked: tests/outside (C-FAR).
 */
export function reactiveLimitM(sizeM: number, frequencyHz: number): number {
  return 0.62 * Math.sqrt(positive('sizeM', sizeM) ** 3 / wavelengthM(frequencyHz));
}

/**
 * Phase error at the edge of an antenna in a spherical wave.
 *
 * @param sizeM dimension D across the wave, in m
 * @param distanceM distance R of the wave's centre, in m
 * @param frequencyHz frequency in Hz
 * @returns 360° (√(R² + D²/4) − R)/λ in degrees
 * Source: geometry; IEEE Std 149. Checked: tests/outside (C-PHASE, C-PHASE-EXACT).
 */
export function edgePhaseDeg(sizeM: number, distanceM: number, frequencyHz: number): number {
  const halfM = positive('sizeM', sizeM) / 2;
  const longer = Math.hypot(positive('distanceM', distanceM), halfM);
  // The difference of two nearly equal lengths, written so that no digits are lost.
  return (360 * halfM * halfM) / (longer + distanceM) / wavelengthM(frequencyHz);
}
