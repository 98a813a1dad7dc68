// The drift of a run as its ties show it: for each segment a correction in time, all of them referred to the
// first tie of the run, so that every cut of a run shares one level. Mathematics is in pattern/.
import type { SampleRecord } from '../archive/archive.ts';
import { type Drift, type DriftRefused, driftOf, type Tie } from '../pattern/drift.ts';
import { absentFigure, type Figure } from '../pattern/figure.ts';
import { tieRatio } from '../pattern/tie-ratio.ts';

export interface RunDrift {
  /** The sample's transmission as it would have been at the run's first tie; untouched without ties. */
  corrected(sample: SampleRecord): Float64Array;
  /** Per frequency: largest minus least level over the ties of a segment. */
  driftDb: Figure[];
  /** The ties of a segment do not join: its samples stay uncorrected. */
  refused?: DriftRefused;
}

/** `samples` in order of sequence; ties of other cuts only serve as the common first one. */
export function runDrift(
  samples: readonly SampleRecord[],
  cut: string,
  frequenciesHz: readonly number[],
): RunDrift {
  const ties = samples.filter((sample) => sample.purpose === 'tie' && sample.traces.has('S21'));
  const first = ties[0]?.traces.get('S21');
  const bySegment = new Map<number, { drift: Drift; anchor: Float64Array }>();
  let refused: DriftRefused | undefined;
  for (const segment of new Set(samples.map((sample) => sample.segment))) {
    const visits = ties.filter((tie) => tie.cut === cut && tie.segment === segment);
    if (!first || visits.length === 0) continue;
    const ratios = visits.map(
      (visit): Tie => ({
        timeMs: middleMs(visit),
        trace: tieRatio(frequenciesHz, first, visit.traces.get('S21')!),
      }),
    );
    const drift = driftOf(ratios);
    if (drift.kind === 'refused') refused ??= drift;
    else bySegment.set(segment, { drift, anchor: inverse(ratios[0]!.trace) });
  }
  const drifts = [...bySegment.values()].map(({ drift }) => drift);
  return {
    corrected(sample) {
      const trace = sample.traces.get('S21')!;
      const own = bySegment.get(sample.segment);
      if (!own) return trace;
      return product(product(trace, own.drift.factorsAt(middleMs(sample))), own.anchor);
    },
    driftDb: frequenciesHz.map((_, k) => largestDrift(drifts, refused, k)),
    ...(refused ? { refused } : {}),
  };
}

function middleMs(sample: SampleRecord): number {
  return (sample.startMonotonicMs + sample.stopMonotonicMs) / 2;
}

function largestDrift(drifts: readonly Drift[], refused: DriftRefused | undefined, k: number): Figure {
  if (refused) return absentFigure(refused.because);
  const figures = drifts.map((drift) => drift.driftDb[k]!);
  const values = figures.flatMap((figure) => (figure.kind === 'value' ? [figure] : []));
  const largest = values.sort((a, b) => b.value - a.value)[0];
  return largest ?? figures[0] ?? absentFigure('the cut has no ties');
}

function product(a: Float64Array, b: Float64Array): Float64Array {
  const result = new Float64Array(a.length);
  for (let i = 0; i < a.length; i += 2) {
    result[i] = a[i]! * b[i]! - a[i + 1]! * b[i + 1]!;
    result[i + 1] = a[i]! * b[i + 1]! + a[i + 1]! * b[i]!;
  }
  return result;
}

/** 1/a, value by value; one where a is zero, which driftOf has refused already. */
function inverse(a: Float64Array): Float64Array {
  const result = new Float64Array(a.length);
  for (let i = 0; i < a.length; i += 2) {
    const size = a[i]! ** 2 + a[i + 1]! ** 2;
    result[i] = size > 0 ? a[i]! / size : 1;
    result[i + 1] = size > 0 ? -a[i + 1]! / size : 0;
  }
  return result;
}
