// The noise of a cut as the cut itself shows it: what changes from sample to sample faster than any lobe
// could. It keeps noise from being read as lobes; it is not the range's floor, which is measured.
import type { Beamwidth } from './beamwidth.ts';
import type { Cut } from './cut.ts';
import { amplitudeDb, amplitudeRatio, lowestLevelDb } from './decibels.ts';
import type { FigureAbsent } from './figure.ts';
import type { Peak } from './peak.ts';

/** Fewer samples than this across the half-power beam, and lobes themselves change from sample to sample. */
const fewestAcrossBeam = 10;
/** Weights of the third difference: blind to any parabola. Their squares add up to 20. */
const weights = [1, -3, 3, -1] as const;
/** Median of |x| of a Gaussian of standard deviation 1. */
const medianOfGaussian = 0.6745;

/**
 * Noise level of a cut from its own samples.
 *
 * Third differences of the amplitude over neighbouring samples; their median magnitude is hardly moved by
 * the kinks at nulls. Additive noise of rms amplitude n shows in the magnitude as n/√2.
 *
 * @param cut levels in dB over degrees
 * @param peak its peak
 * @param halfPower its half-power beam, or the reason why there is none
 * @returns level of the noise's rms amplitude in the unit of the cut, or undefined where there is no
 *   half-power beam, or fewer than ten samples across it
 * Source: robust scale by the median absolute deviation (Hampel 1974); third differences: our own choice.
 * Checked: tests/unit/daemon/pattern/cut-noise.test.ts.
 */
export function cutNoiseDb(cut: Cut, peak: Peak, halfPower: Beamwidth | FigureAbsent): number | undefined {
  if (halfPower.kind === 'absent') return undefined;
  const { anglesDeg, levelDb, periodic } = cut;
  const count = levelDb.length;
  const spanDeg = periodic ? 360 : anglesDeg[count - 1]! - anglesDeg[0]!;
  const stepDeg = spanDeg / (periodic ? count : count - 1);
  if (halfPower.value < fewestAcrossBeam * stepDeg) return undefined;
  const amplitude = levelDb.map((level) => amplitudeRatio(Math.max(lowestLevelDb, level - peak.levelDb)));
  const differences = new Float64Array(periodic ? count : count - 3);
  for (let k = 0; k < differences.length; k += 1) {
    differences[k] = Math.abs(
      weights[0] * amplitude[k]! +
        weights[1] * amplitude[(k + 1) % count]! +
        weights[2] * amplitude[(k + 2) % count]! +
        weights[3] * amplitude[(k + 3) % count]!,
    );
  }
  differences.sort();
  const median = differences[differences.length >> 1]!;
  const inMagnitude = median / medianOfGaussian / Math.sqrt(20);
  return peak.levelDb + amplitudeDb(Math.SQRT2 * inMagnitude);
}
