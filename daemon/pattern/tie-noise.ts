// The noise of single sweeps as repeated boresight visits show it: what is left between a tie and the first
// one when their common drift is taken out. Part of the range's floor, not yet its leakage.
import { amplitudeDb, lowestLevelDb } from './decibels.ts';
import { type PooledPower, pooledPower } from './flat-window.ts';
import { PatternError } from './pattern-error.ts';
import { tieRatio } from './tie-ratio.ts';

/**
 * Noise level of one sweep at each frequency.
 *
 * With r the drift ratio (see tie-ratio.ts), tie − r·first holds the noise of both sweeps: its mean square
 * over later ties and over the neighbours within ±2.5 % of the frequency, divided by 1 + |r|², is the noise
 * power of one sweep. Neighbours share their noise in an analyzer; a spur narrower than the window does not
 * show here.
 *
 * @param frequenciesHz N frequencies in Hz, ascending
 * @param ties complex traces of visits to one position, interleaved re, im, length 2N each
 * @returns N levels of the noise's rms amplitude, 20 log of it, in the unit of the traces; undefined for
 *   fewer than two ties or fewer than eight values in the window, too few to speak of noise
 * @throws PatternError for traces of other length, or numbers that are not finite
 * Source: JCGM 100:2008, 4.2 (type A evaluation), pooled. Checked: tests/unit/daemon/pattern/tie-noise.test.ts.
 */
export function tieNoiseDb(
  frequenciesHz: ArrayLike<number>,
  ties: readonly Float64Array[],
): Float64Array | undefined {
  const [first, ...later] = ties;
  if (!first || later.length === 0) return undefined;
  if (first.length !== 2 * frequenciesHz.length) {
    throw new PatternError('Hand in ties with one complex value for each frequency.', {
      frequencies: frequenciesHz.length,
      tie: first.length,
    });
  }
  const power = meanSquares(frequenciesHz, first, later);
  const pooled = pooledPower(frequenciesHz, power, later.length);
  return pooled && Float64Array.from(pooled, levelDb);
}

/** Mean over the later ties of |tie − r·first|²/(1 + |r|²), per frequency. */
function meanSquares(
  frequenciesHz: ArrayLike<number>,
  first: Float64Array,
  later: readonly Float64Array[],
): Float64Array {
  const count = frequenciesHz.length;
  const mean = new Float64Array(count);
  for (const tie of later) {
    const ratio = tieRatio(frequenciesHz, first, tie);
    for (let k = 0; k < count; k += 1) {
      const [a, b] = [first[2 * k]!, first[2 * k + 1]!];
      const [r, s] = [ratio[2 * k]!, ratio[2 * k + 1]!];
      const re = tie[2 * k]! - (r * a - s * b);
      const im = tie[2 * k + 1]! - (r * b + s * a);
      mean[k]! += (re * re + im * im) / (1 + r * r + s * s) / later.length;
    }
  }
  return mean;
}

/** One complex factor was fitted to the window: two of its 2·values real numbers are spent. */
function levelDb({ power, values }: PooledPower): number {
  const spent = values > 1 ? values / (values - 1) : 1;
  return Math.max(lowestLevelDb, amplitudeDb(Math.sqrt(Math.max(0, power * spent))));
}
