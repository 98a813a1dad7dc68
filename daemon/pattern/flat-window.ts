// The neighbourhood of a frequency over which drift and noise count as the same, and means over it. What is
// drawn from such a window is no finer in frequency than the window.

/** Half the window, as a share of the frequency. */
export const flatShare = 0.025;

/** Fewer values than this in a window say little of their scatter. */
const fewestValues = 8;

/** Indices of the first neighbour, and of the one behind the last. */
export interface FlatWindow {
  from: number;
  to: number;
}

/**
 * The neighbours of each frequency within ±2.5 % of it, itself among them.
 *
 * @param frequenciesHz N frequencies in Hz, ascending
 * @returns N windows
 * Checked: tests/unit/daemon/pattern/tie-ratio.test.ts, tie-noise.test.ts, mean-noise.test.ts.
 */
export function flatWindows(frequenciesHz: ArrayLike<number>): FlatWindow[] {
  let from = 0;
  let to = 0;
  return Array.from(frequenciesHz, (hz) => {
    while (frequenciesHz[from]! < hz * (1 - flatShare)) from += 1;
    while (to < frequenciesHz.length && frequenciesHz[to]! <= hz * (1 + flatShare)) to += 1;
    return { from, to };
  });
}

/** Mean of a noise power over one window, and of how many frequencies. */
export interface PooledPower {
  power: number;
  values: number;
}

/**
 * Noise power pooled over the window of each frequency.
 *
 * @param frequenciesHz N frequencies in Hz, ascending
 * @param power N noise powers, one for each frequency
 * @param repeats how many independent values each of them stands for
 * @returns N means; undefined where a window holds fewer than eight values, too few to speak of noise
 * Source: JCGM 100:2008, 4.2 (type A evaluation), pooled. Checked: as flatWindows.
 */
export function pooledPower(
  frequenciesHz: ArrayLike<number>,
  power: Float64Array,
  repeats: number,
): PooledPower[] | undefined {
  const sums = new Float64Array(power.length + 1);
  for (let k = 0; k < power.length; k += 1) sums[k + 1] = sums[k]! + power[k]!;
  const pooled = flatWindows(frequenciesHz).map(({ from, to }) => {
    const values = to - from;
    return { power: (sums[to]! - sums[from]!) / values, values };
  });
  return pooled.some(({ values }) => values * repeats < fewestValues) ? undefined : pooled;
}
