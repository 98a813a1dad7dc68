// Receiver noise for tests: complex, Gaussian, from a seed. Added to a level it moves its magnitude.

/** Gaussian numbers of deviation 1: the sum of twelve uniform ones, from a linear congruential sequence. */
export function gaussian(seed: number): () => number {
  let state = Math.imul(seed, 2654435761) >>> 0;
  const uniform = () => {
    state = (Math.imul(state, 1664525) + 1013904223) >>> 0;
    return state / 2 ** 32;
  };
  return () => {
    let sum = -6;
    for (let k = 0; k < 12; k += 1) sum += uniform();
    return sum;
  };
}

/** Levels in dB with additive complex noise of an rms level in dB. */
export function noisy(levelDb: Float64Array, noiseDb: number, seed: number): Float64Array {
  const next = gaussian(seed);
  const deviation = 10 ** (noiseDb / 20) / Math.SQRT2;
  return levelDb.map((level) => {
    const [re, im] = [10 ** (level / 20) + deviation * next(), deviation * next()];
    return 20 * Math.log10(Math.hypot(re, im));
  });
}
