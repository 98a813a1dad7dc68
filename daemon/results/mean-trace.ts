// The complex mean of several traces of one kind, such as the match at all ties. Nothing is weighted.
import type { SParameter } from '../../drivers/analyzer/analyzer.ts';
import type { SampleRecord } from '../archive/archive.ts';

/** Mean over the samples that carry the parameter, interleaved, length 2N; undefined where none does. */
export function meanTrace(
  samples: readonly Pick<SampleRecord, 'traces'>[],
  parameter: SParameter,
): Float64Array | undefined {
  const traces = samples.flatMap((sample) => sample.traces.get(parameter) ?? []);
  const first = traces[0];
  if (!first) return undefined;
  const sum = new Float64Array(first.length);
  for (const trace of traces) {
    for (let i = 0; i < sum.length; i += 1) sum[i] = sum[i]! + (trace[i] ?? 0);
  }
  return sum.map((value) => value / traces.length);
}

/** Magnitudes of a complex trace: N values. */
export function magnitudes(trace: Float64Array): Float64Array {
  return Float64Array.from({ length: trace.length / 2 }, (_, k) =>
    Math.hypot(trace[2 * k]!, trace[2 * k + 1]!),
  );
}
