// How far a tie has moved from the first one, with less noise than a single frequency gives: drift of cables,
// couplers and receivers is smooth over frequency, while boresight may sit in a null at some of them.
//
//   r(f) = Σ tie·first* / Σ |first|²   over the neighbours of f within ±2.5 % of it
import { flatWindows } from './flat-window.ts';
import { finite, PatternError } from './pattern-error.ts';

/**
 * Complex ratio of a tie to the first tie, at each frequency.
 *
 * The least-squares factor over a window of neighbours: frequencies at which boresight is in a null lean on
 * those at which it is not. A delay drift that turns the phase by 60° turns it by 1.5° more or less at the
 * ends of the window, which changes the level by less than 0.002 dB.
 *
 * @param frequenciesHz N frequencies in Hz, ascending
 * @param first complex trace of the first tie, interleaved re, im, length 2N
 * @param tie complex trace of a later tie, same shape
 * @returns N complex ratios, interleaved, length 2N; one where the first tie is zero throughout the window
 * @throws PatternError for traces of other length, or numbers that are not finite
 * Source: linear least squares for one complex factor; the window is our own choice.
 * Checked: tests/unit/daemon/pattern/tie-ratio.test.ts.
 */
export function tieRatio(
  frequenciesHz: ArrayLike<number>,
  first: Float64Array,
  tie: Float64Array,
): Float64Array {
  const count = frequenciesHz.length;
  if (first.length !== 2 * count || tie.length !== 2 * count) {
    throw new PatternError('Hand in two ties with one complex value for each frequency.', {
      frequencies: count,
      first: first.length,
      tie: tie.length,
    });
  }
  for (let k = 0; k < count; k += 1) finite('frequencyHz', frequenciesHz[k]!);
  const sums = runningSums(first, tie);
  const ratio = new Float64Array(2 * count);
  for (const [k, { from, to }] of flatWindows(frequenciesHz).entries()) {
    const power = sums.power[to]! - sums.power[from]!;
    ratio[2 * k] = power > 0 ? (sums.re[to]! - sums.re[from]!) / power : 1;
    ratio[2 * k + 1] = power > 0 ? (sums.im[to]! - sums.im[from]!) / power : 0;
  }
  return ratio;
}

function runningSums(first: Float64Array, tie: Float64Array) {
  const count = first.length / 2;
  const re = new Float64Array(count + 1);
  const im = new Float64Array(count + 1);
  const power = new Float64Array(count + 1);
  for (let k = 0; k < count; k += 1) {
    const [a, b] = [finite('a tie', first[2 * k]!), finite('a tie', first[2 * k + 1]!)];
    const [c, d] = [finite('a tie', tie[2 * k]!), finite('a tie', tie[2 * k + 1]!)];
    re[k + 1] = re[k]! + c * a + d * b;
    im[k + 1] = im[k]! + d * a - c * b;
    power[k + 1] = power[k]! + a * a + b * b;
  }
  return { re, im, power };
}
