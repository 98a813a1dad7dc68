// The samples of one cut → one `Cut` per frequency: brought back to the first tie of the run, in order of
// angle, closure taken from both ends of a full turn. Mathematics is in pattern/; this only collects.
import type { SampleRecord } from '../archive/archive.ts';
import type { Closure } from '../pattern/closure.ts';
import { type Cut, type CutSamples, cutFromSamples } from '../pattern/cut.ts';
import { amplitudeDb } from '../pattern/decibels.ts';
import type { DriftRefused } from '../pattern/drift.ts';
import { absentFigure, type Figure } from '../pattern/figure.ts';
import { runDrift } from './run-drift.ts';

export interface CutLevels {
  /** One per frequency; empty when there are too few samples for a pattern, with the reason. */
  cuts: Cut[];
  because?: string;
  closureDb: Figure[];
  driftDb: Figure[];
  driftRefused?: DriftRefused;
  /** Noise of one sweep per frequency, in the unit of the levels, where repeats have shown it. */
  floorDb?: Float64Array;
}

/** Closer to the floor than this the ends of a turn differ by noise. Common practice, no source. */
const closureMarginDb = 20;

/** `samples`: all samples of one run in order of sequence; `cut`: the cut's name. */
export function cutLevels(
  samples: readonly SampleRecord[],
  cut: string,
  frequenciesHz: readonly number[],
  floorDb?: Float64Array,
): CutLevels {
  const own = latestPerAngle(samples.filter((sample) => sample.cut === cut && isOfCut(sample)));
  const drift = runDrift(samples, cut, frequenciesHz);
  const refused = drift.refused ? { driftRefused: drift.refused } : {};
  if (own.length < 3) {
    const because = `the cut has ${own.length} samples; a pattern needs three or more`;
    const closureDb = frequenciesHz.map(() => absentFigure(because));
    return { cuts: [], because, closureDb, driftDb: drift.driftDb, ...refused };
  }
  const traces = own.map((sample) => drift.corrected(sample));
  const ends = [traces[0]!, traces.at(-1)!] as const;
  const anglesDeg = own.map((sample) => sample.angleDeg);
  const built = frequenciesHz.map((_, k) => cutFromSamples(atFrequency(anglesDeg, traces, k)));
  return {
    cuts: built.map(({ cut }) => cut),
    closureDb: built.map(({ closure }, k) => closureFigure(closure, ends, k, floorDb?.[k])),
    driftDb: drift.driftDb,
    ...refused,
    ...(floorDb ? { floorDb } : {}),
  };
}

/** Ends that stand near the floor differ by noise and tell nothing of the turn. */
function closureFigure(
  closure: Closure | undefined,
  ends: readonly [Float64Array, Float64Array],
  k: number,
  floorDb: number | undefined,
): Figure {
  if (!closure) return absentFigure('the cut is no full turn');
  const levelsDb = ends.map((trace) => amplitudeDb(Math.hypot(trace[2 * k]!, trace[2 * k + 1]!)));
  if (floorDb !== undefined && Math.min(...levelsDb) < floorDb + closureMarginDb) {
    return absentFigure(`the ends of the turn lie within ${closureMarginDb} dB of the floor`);
  }
  return closure.levelDb;
}

function isOfCut(sample: SampleRecord): boolean {
  return sample.purpose === 'cut' || sample.purpose === 'closure';
}

/** One sample per angle, the latest; a position repeated after an interruption replaces the earlier. */
function latestPerAngle(samples: readonly SampleRecord[]): SampleRecord[] {
  const byAngle = new Map<string, SampleRecord>();
  for (const sample of samples) byAngle.set(`${sample.purpose} ${sample.angleDeg.toFixed(6)}`, sample);
  const ascending = [...byAngle.values()].sort((a, b) => a.angleDeg - b.angleDeg);
  // In the order of travel: the closure is the end of a turn, so that it is last minus first.
  return ascending[0]?.purpose === 'closure' ? ascending.reverse() : ascending;
}

function atFrequency(anglesDeg: readonly number[], traces: readonly Float64Array[], k: number): CutSamples {
  const trace = new Float64Array(2 * traces.length);
  for (const [row, values] of traces.entries()) {
    trace[2 * row] = values[2 * k]!;
    trace[2 * row + 1] = values[2 * k + 1]!;
  }
  return { anglesDeg, trace };
}
