// What a grid of frequencies can tell of path lengths: how near two ways may be to be seen apart, and from which
// length on they fold back. Path lengths are one-way, as a transmission between two antennas has them.
import { speedOfLightMS } from './friis.ts';
import { positive } from './pattern-error.ts';

/**
 * How much a Kaiser window of beta 6 widens the response of a band: its main lobe at −3 dB is 1.4049 bins wide,
 * that of the unwindowed band 0.8859. Source: published widths of the window. Checked: tests/outside (G-KAISER-MET).
 */
export const kaiser6Widening = 1.4049 / 0.8859;

/**
 * Difference of path lengths that a band resolves.
 *
 * @param spanHz width of the band in Hz
 * @returns c/B in m
 * Source: duality of time and frequency. Checked: tests/outside (G-RES).
 */
export function pathResolutionM(spanHz: number): number {
  return speedOfLightMS / positive('spanHz', spanHz);
}

/**
 * The same behind a Kaiser window of beta 6, whose side lobes no longer hide a weak way beside a strong one.
 *
 * @param spanHz width of the band in Hz
 * @returns 1.59 c/B in m; 4.8 m for 100 MHz
 * Source: as `kaiser6Widening`. Checked: tests/unit/daemon/pattern/path-resolution.test.ts.
 */
export function windowedResolutionM(spanHz: number): number {
  return kaiser6Widening * pathResolutionM(spanHz);
}

/**
 * Path length from which on a way looks like a shorter one.
 *
 * @param stepHz distance of neighbouring frequencies in Hz
 * @returns c/Δf in m
 * Source: sampling theorem. Checked: tests/outside (G-ALIAS).
 */
export function aliasFreePathM(stepHz: number): number {
  return speedOfLightMS / positive('stepHz', stepHz);
}

/**
 * Period over frequency of the ripple that a longer way causes.
 *
 * @param excessM by how much the way is longer, in m
 * @returns c/ΔL in Hz
 * Source: closed form. Checked: tests/outside (G-ECHO-PERIOD).
 */
export function echoPeriodHz(excessM: number): number {
  return speedOfLightMS / positive('excessM', excessM);
}
