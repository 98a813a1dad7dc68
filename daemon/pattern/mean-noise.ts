// The noise of the mean of several visits, as their scatter shows it: what the mean reflection of an antenna
// can still be moved by. Unlike tie-noise.ts it takes no common drift out: a reflection that drifts is known
// less well, and an antenna that reflects nothing has no level to take a drift from.
import { pooledPower } from './flat-window.ts';
import { finite, PatternError } from './pattern-error.ts';

/**
 * Noise of the mean over visits at each frequency.
 *
 * The squares of the differences between each visit and the mean, pooled over the neighbours within ±2.5 %
 * of the frequency, over V − 1 for one visit and over V once more for the mean of V. What is the same at
 * all visits (directivity, a wrong calibration) does not show here.
 *
 * @param frequenciesHz N frequencies in Hz, ascending
 * @param visits V complex traces of one quantity, interleaved re, im, length 2N each
 * @returns N rms amplitudes of the mean's complex noise, in the unit of the traces; undefined for fewer than
 *   two visits or fewer than eight values in a window, too few to speak of noise
 * @throws PatternError for traces of other length, or numbers that are not finite
 * Source: JCGM 100:2008, 4.2 (type A evaluation), pooled. Checked: tests/unit/daemon/pattern/mean-noise.test.ts.
 */
export function meanNoise(
  frequenciesHz: ArrayLike<number>,
  visits: readonly Float64Array[],
): Float64Array | undefined {
  const count = frequenciesHz.length;
  const wrong = visits.find((visit) => visit.length !== 2 * count);
  if (wrong) {
    throw new PatternError('Hand in visits with one complex value for each frequency.', {
      frequencies: count,
      visit: wrong.length,
    });
  }
  if (visits.length < 2) return undefined;
  const power = Float64Array.from({ length: count }, (_, k) => scatter(visits, k));
  const pooled = pooledPower(frequenciesHz, power, visits.length - 1);
  return pooled && Float64Array.from(pooled, (one) => Math.sqrt(Math.max(0, one.power / visits.length)));
}

/** Noise power of one visit at one frequency. */
function scatter(visits: readonly Float64Array[], k: number): number {
  let power = 0;
  for (const part of [2 * k, 2 * k + 1]) {
    const values = visits.map((visit) => finite('a visit', visit[part]!));
    const mean = values.reduce((sum, value) => sum + value, 0) / values.length;
    for (const value of values) power += (value - mean) ** 2;
  }
  return power / (visits.length - 1);
}
