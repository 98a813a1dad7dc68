// After an interruption the last positions are taken once more: what they differ by, the rest of the cut will
// differ by. Compares and tells; whether the cut can still be used is for the reader of the flag.
import { amplitudeDb } from '../pattern/decibels.ts';

/** Median over the frequencies of the level difference, later minus earlier, in dB. */
export function medianDifferenceDb(earlier: Float64Array, later: Float64Array): number {
  const differences = Array.from({ length: Math.min(earlier.length, later.length) / 2 }, (_, k) => {
    const before = amplitudeDb(Math.hypot(earlier[2 * k]!, earlier[2 * k + 1]!));
    return amplitudeDb(Math.hypot(later[2 * k]!, later[2 * k + 1]!)) - before;
  }).sort((a, b) => a - b);
  return differences[Math.floor(differences.length / 2)] ?? 0;
}
