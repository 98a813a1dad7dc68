// Power radiated towards a person, and the distance at which it has thinned out to a given density. The far-field
// formula: near an antenna the field differs, and local rules go before any figure of this file.
import { powerRatio } from './decibels.ts';
import { absentFigure, type Figure, valueFigure } from './figure.ts';
import { finite, positive } from './pattern-error.ts';

/**
 * Equivalent isotropically radiated power.
 *
 * @param powerDbm power into the antenna's cable in dBm
 * @param gainDbi gain of the antenna in dBi
 * @returns EIRP in W
 * Source: IEEE Std 145. Checked: tests/outside (E-DIST).
 */
export function eirpW(powerDbm: number, gainDbi: number): number {
  return powerRatio(finite('powerDbm', powerDbm) + finite('gainDbi', gainDbi) - 30);
}

/**
 * Distance at which a power density is no longer exceeded in the beam.
 *
 * @param radiatedW EIRP in W, above zero
 * @param limitWM2 power density S in W/m², above zero
 * @param reflectionFactor power added by reflections: 1 in free space, 2.56 for a field 1.6 times as strong
 *   over ground, 4 for a doubled field
 * @returns √(F·EIRP/(4πS)) in m
 * Source: FCC OET Bulletin 65 (1997), section 2. Checked: tests/outside (E-DIST, E-OET-FACTOR, E-OET-EX).
 */
export function densityDistanceM(radiatedW: number, limitWM2: number, reflectionFactor = 1): number {
  const factor = positive('reflectionFactor', reflectionFactor);
  return Math.sqrt(
    (factor * positive('radiatedW', radiatedW)) / (4 * Math.PI * positive('limitWM2', limitWM2)),
  );
}

/**
 * Reference level for the general public, whole body, of ICNIRP 2020.
 *
 * @param frequencyHz frequency in Hz
 * @returns incident power density in W/m²; absent up to 30 MHz and beyond 300 GHz
 * Source: ICNIRP, Health Physics 118(5), 2020, table 5. Checked: tests/outside (E-ICNIRP-PTS).
 */
export function icnirpPublicWM2(frequencyHz: number): Figure {
  const mhz = positive('frequencyHz', frequencyHz) / 1e6;
  if (mhz <= 30 || mhz > 300_000)
    return absentFigure('the levels are power densities above 30 MHz to 300 GHz only');
  return valueFigure(mhz <= 400 ? 2 : mhz <= 2000 ? mhz / 200 : 10);
}

/**
 * Limit for the general population in the United States.
 *
 * @param frequencyHz frequency in Hz
 * @returns power density in W/m²; absent below 30 MHz and beyond 100 GHz
 * Source: 47 CFR 1.1310, table 1 (B); 1 mW/cm² is 10 W/m². Checked: tests/outside (E-FCC-PTS).
 */
export function fccPublicWM2(frequencyHz: number): Figure {
  const mhz = positive('frequencyHz', frequencyHz) / 1e6;
  if (mhz < 30 || mhz > 100_000)
    return absentFigure('the limits are power densities from 30 MHz to 100 GHz only');
  return valueFigure(mhz <= 300 ? 2 : mhz <= 1500 ? mhz / 150 : 10);
}
