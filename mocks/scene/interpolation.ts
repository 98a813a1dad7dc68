// Interpolation in frequency for computed antennas: four neighbours on an even grid.

/**
 * Index of the first of four neighbours and their weights at `at` (Catmull and Rom's cubic: exact at the
 * knots, slope continuous). Beyond the first and last knot the end value holds; in the outer intervals the
 * missing neighbour is the straight continuation.
 */
export function cubicWeights(
  knots: readonly number[],
  at: number,
): { first: number; weights: readonly [number, number, number, number] } {
  const last = knots.length - 1;
  const step = (knots[last]! - knots[0]!) / last;
  const place = Math.max(0, Math.min(last, (at - knots[0]!) / step));
  const interval = Math.min(last - 1, Math.floor(place));
  const t = place - interval;
  const a = (-t + 2 * t * t - t * t * t) / 2;
  const b = (2 - 5 * t * t + 3 * t * t * t) / 2;
  const c = (t + 4 * t * t - 3 * t * t * t) / 2;
  const d = (-t * t + t * t * t) / 2;
  // The missing neighbour before the first knot is 2·k0 − k1, after the last 2·kn − k(n−1).
  if (interval === 0) return { first: 0, weights: [b + 2 * a, c - a, d, 0] };
  if (interval === last - 1) return { first: last - 3, weights: [0, a, b - d, c + 2 * d] };
  return { first: interval - 1, weights: [a, b, c, d] };
}

/** Adds whole turns so that neighbours differ by less than half a turn. */
export function unwrapDegrees(phasesDeg: readonly number[]): number[] {
  const out: number[] = [];
  for (const phaseDeg of phasesDeg) {
    const before = out.at(-1) ?? phaseDeg;
    out.push(phaseDeg - 360 * Math.round((phaseDeg - before) / 360));
  }
  return out;
}
