// Drift between ties: the range, watched at boresight, moves in level and phase while the cut is taken. From
// the ties follows the complex factor that brings a sample of any moment back to the first tie.
//
//   tie ●──────────────●─────────────● tie      level in dB and unwrapped phase, straight from tie to tie,
//        sample ↑ factor                        held before the first and after the last
import { wrapDeg } from './angles.ts';
import { amplitudeDb, amplitudeRatio, lowestLevelDb } from './decibels.ts';
import { absentFigure, type Figure, valueFigure } from './figure.ts';
import { finite, PatternError } from './pattern-error.ts';

/** Further than this from tie to tie, the phase between them is a guess. */
export const largestTurnDeg = 60;

/** One visit to boresight. */
export interface Tie {
  /** Time of the visit in ms, on the clock of the samples. */
  timeMs: number;
  /** Complex trace, interleaved re, im, length 2N. */
  trace: Float64Array;
}

export interface Drift {
  kind: 'value';
  ties: number;
  /** N figures: largest minus least level over the ties, in dB. */
  driftDb: Figure[];
  /** N figures: largest minus least unwrapped phase, in degrees. */
  turnDeg: Figure[];
  /**
   * Complex factors for a sample taken at `timeMs`: interleaved re, im, length 2N; multiply the sample's
   * trace by them, value by value.
   */
  factorsAt(timeMs: number): Float64Array;
}

/** The ties cannot be joined; the samples between them stay uncorrected. */
export interface DriftRefused {
  kind: 'refused';
  because: string;
  /** Indices of the frequencies at which it fails. */
  frequencyIndices: number[];
  /** Times in ms of the two ties that first do not join. */
  betweenMs: [number, number];
  /** Largest turn found, in degrees; absent where a tie is zero. */
  worstTurnDeg?: number;
}

/**
 * Drift from the ties of one cut.
 *
 * Level in dB and unwrapped phase are linear in time between ties and held beyond them; all factors are
 * relative to the first tie. One tie alone gives factors of one.
 *
 * @param ties one or more, ascending in time, traces of one length
 * @returns the drift; refused when the phase turns by more than 60° between two ties at any frequency, or a
 *   tie is exactly zero there
 * @throws PatternError for no ties, times out of order, traces of different length, or non-finite numbers
 * Source: common practice, no source. Checked: tests/unit/daemon/pattern/drift.test.ts.
 */
export function driftOf(ties: readonly Tie[]): Drift | DriftRefused {
  const count = checkTies(ties);
  const levels = ties.map(({ trace }) => perFrequency(trace, (re, im) => amplitudeDb(Math.hypot(re, im))));
  const phases = ties.map(({ trace }) =>
    perFrequency(trace, (re, im) => (Math.atan2(im, re) * 180) / Math.PI),
  );
  const turns = phases.slice(1).map((phase, t) => phase.map((deg, k) => wrapDeg(deg - phases[t]![k]!)));
  const refused = refusal(ties, levels, turns);
  if (refused) return refused;
  const level = levels.map((row) => row.map((db, k) => db - levels[0]![k]!));
  const phase = [new Float64Array(count)];
  for (const turn of turns) phase.push(turn.map((deg, k) => deg + phase.at(-1)![k]!));
  const timesMs = ties.map((tie) => tie.timeMs);
  return {
    kind: 'value',
    ties: ties.length,
    driftDb: spans(level, count),
    turnDeg: spans(phase, count),
    factorsAt: (timeMs) => factors(timesMs, level, phase, finite('timeMs', timeMs)),
  };
}

function factors(
  timesMs: readonly number[],
  level: readonly Float64Array[],
  phase: readonly Float64Array[],
  timeMs: number,
): Float64Array {
  const after = timesMs.findIndex((time) => time >= timeMs);
  const upper = after < 0 ? timesMs.length - 1 : after;
  const lower = after < 0 ? upper : Math.max(0, after - 1);
  const gap = timesMs[upper]! - timesMs[lower]!;
  const share = gap > 0 ? (timeMs - timesMs[lower]!) / gap : 0;
  const between = (rows: readonly Float64Array[], k: number) =>
    rows[lower]![k]! * (1 - share) + rows[upper]![k]! * share;
  const found = new Float64Array(2 * level[0]!.length);
  for (let k = 0; k < level[0]!.length; k += 1) {
    const size = amplitudeRatio(0 - between(level, k));
    const angle = (between(phase, k) * Math.PI) / 180;
    found[2 * k] = size * Math.cos(angle);
    found[2 * k + 1] = 0 - size * Math.sin(angle);
  }
  return found;
}

function refusal(
  ties: readonly Tie[],
  levels: readonly Float64Array[],
  turns: readonly Float64Array[],
): DriftRefused | undefined {
  const indices = new Set<number>();
  let between: [number, number] | undefined;
  let worstTurnDeg = 0;
  let zero = false;
  for (let t = 0; t < turns.length; t += 1) {
    for (let k = 0; k < turns[t]!.length; k += 1) {
      const isZero = levels[t]![k] === lowestLevelDb || levels[t + 1]![k] === lowestLevelDb;
      const turnDeg = Math.abs(turns[t]![k]!);
      if (!isZero && turnDeg <= largestTurnDeg) continue;
      zero ||= isZero;
      if (!isZero) worstTurnDeg = Math.max(worstTurnDeg, turnDeg);
      indices.add(k);
      between ??= [ties[t]!.timeMs, ties[t + 1]!.timeMs];
    }
  }
  if (!between) return undefined;
  const frequencyIndices = [...indices].sort((a, b) => a - b);
  if (worstTurnDeg === 0 && zero) {
    return { kind: 'refused', because: 'a tie is zero', frequencyIndices, betweenMs: between };
  }
  const because = `the phase turns by ${worstTurnDeg.toFixed(0)}° between ties, more than ${largestTurnDeg}°: tie more often`;
  return { kind: 'refused', because, frequencyIndices, betweenMs: between, worstTurnDeg };
}

function spans(rows: readonly Float64Array[], count: number): Figure[] {
  if (rows.length < 2) {
    return Array.from({ length: count }, () => absentFigure('one tie alone: nothing to compare it with'));
  }
  return Array.from({ length: count }, (_, k) => {
    const values = rows.map((row) => row[k]!);
    return valueFigure(Math.max(...values) - Math.min(...values));
  });
}

function perFrequency(trace: Float64Array, figure: (re: number, im: number) => number): Float64Array {
  return Float64Array.from({ length: trace.length / 2 }, (_, k) => figure(trace[2 * k]!, trace[2 * k + 1]!));
}

function checkTies(ties: readonly Tie[]): number {
  const first = ties[0];
  if (!first) throw new PatternError('There are no ties; hand in one or more.', { ties: 0 });
  ties.forEach((tie, t) => {
    if (t > 0 && finite('timeMs', tie.timeMs) <= ties[t - 1]!.timeMs) {
      throw new PatternError(`Tie ${t} is not later than the one before; hand them in by time.`, { tie: t });
    }
    if (tie.trace.length !== first.trace.length || tie.trace.length % 2 !== 0) {
      throw new PatternError('The traces of the ties differ in length; hand in ties of one setting.', {
        tie: t,
      });
    }
    tie.trace.forEach((value) => {
      finite('a tie', value);
    });
  });
  finite('timeMs', first.timeMs);
  return first.trace.length / 2;
}
