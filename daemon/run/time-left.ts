// How long a run will still take: the prediction for what is left, corrected by how the prediction has
// held so far. Pure.

export interface TimeLeft {
  /** Call once for each finished step, in order. */
  finished(step: number, elapsedMs: number): number;
}

/** `predictedMs`: one entry per step. Returns the predicted rest in ms after each finished step. */
export function timeLeft(predictedMs: readonly number[]): TimeLeft {
  const restMs = new Array<number>(predictedMs.length + 1).fill(0);
  for (let i = predictedMs.length - 1; i >= 0; i -= 1) {
    restMs[i] = (restMs[i + 1] ?? 0) + (predictedMs[i] ?? 0);
  }
  const totalMs = restMs[0] ?? 0;
  return {
    finished(step, elapsedMs) {
      const rest = restMs[step + 1] ?? 0;
      const predictedSoFar = totalMs - rest;
      return predictedSoFar > 0 ? rest * (elapsedMs / predictedSoFar) : rest;
    },
  };
}
