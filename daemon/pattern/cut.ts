// A cut at one frequency: pattern angles and levels, with the complex values where they were measured.
// Everything else in this folder starts from it. Checking is done here, once.
//
//   samples in order of travel ─► unwrap ─► full turn? ─► closure, duplicate end merged ─► ascending ─► Cut
import { unwrapDeg, wrapDeg } from './angles.ts';
import { type Closure, closure, levelClosure } from './closure.ts';
import { largestLevelDb, traceLevelDb } from './decibels.ts';
import { PatternError } from './pattern-error.ts';

/** Angles closer than this are one angle. */
export const smallestStepDeg = 1e-6;

export interface Cut {
  /** N pattern angles in degrees, ascending, no two the same; less than one turn in all. */
  readonly anglesDeg: Float64Array;
  /** N levels in dB: relative, received or gain, as the caller has it. */
  readonly levelDb: Float64Array;
  /** N complex values, interleaved re, im, length 2N, where they were measured. */
  readonly trace?: Float64Array;
  /** True for a full turn: the last angle's neighbour is the first. */
  readonly periodic: boolean;
}

/** Samples in the order of travel, in either direction; levels or complex values. */
export interface CutSamples {
  /** N pattern angles in degrees; both ends of a full turn may be there. */
  anglesDeg: ArrayLike<number>;
  /** N levels in dB; needed where there is no trace. */
  levelDb?: ArrayLike<number>;
  /** N complex values, interleaved, length 2N. */
  trace?: ArrayLike<number>;
}

export interface BuiltCut {
  cut: Cut;
  /** Only for a full turn that was handed in with both its ends. */
  closure?: Closure;
}

/**
 * Builds a cut from samples taken along one travel.
 *
 * A travel of 360° (within a quarter of its smallest step, at most 0.05°) has its first and last sample at
 * one angle: their difference is the closure, their mean (complex where known, else in dB) is the sample of
 * the cut. A travel whose missing part is no more than one and a half of its largest steps is a full turn
 * as well, without closure. Angles of a full turn are wrapped to (−180°, 180°]; those of a part of a turn
 * stay as travelled, so that a cut across 180° is in order.
 *
 * @param samples angles and levels or complex values in order of travel
 * @returns the cut, and the closure where there was a duplicate end
 * @throws PatternError for angles out of order, twice the same, more than a turn, or not finite; for
 *   lengths that do not fit; for fewer than three angles
 * Checked: tests/unit/daemon/pattern/cut.test.ts.
 */
export function cutFromSamples(samples: CutSamples): BuiltCut {
  const given = orderedSamples(samples);
  const { anglesDeg } = given;
  const last = anglesDeg.length - 1;
  const spanDeg = anglesDeg[last]! - anglesDeg[0]!;
  const steps = stepsDeg(anglesDeg);
  const toleranceDeg = Math.min(0.05, steps.smallest / 4);
  if (spanDeg > 360 + toleranceDeg) {
    throw new PatternError(
      `The samples cover ${spanDeg}°, more than one turn; hand in one turn with at most its end twice.`,
      { spanDeg },
    );
  }
  if (Math.abs(spanDeg - 360) <= toleranceDeg) {
    const found = given.trace
      ? closure(given.trace.slice(0, 2), given.trace.slice(2 * last))[0]!
      : levelClosure(given.levelDb[0]!, given.levelDb[last]!);
    return { cut: checkCut(turnedCut(mergedEnds(given))), closure: given.reversed ? opposite(found) : found };
  }
  if (360 - spanDeg <= 1.5 * steps.largest) return { cut: checkCut(turnedCut(given)) };
  return { cut: checkCut(given.cut(false)) };
}

/**
 * Checks what is said of a `Cut`: shapes, order, finite numbers, less than one turn.
 *
 * @param cut any object of that shape
 * @returns the same cut
 * @throws PatternError naming the first value that does not fit, and the remedy
 */
export function checkCut(cut: Cut): Cut {
  const count = cut.anglesDeg.length;
  if (count < 3) {
    throw new PatternError(`The cut has ${count} angles; a pattern needs three or more.`, { count });
  }
  if (cut.levelDb.length !== count || (cut.trace && cut.trace.length !== 2 * count)) {
    throw new PatternError('Angles and levels differ in number; hand in one level for each angle.', {
      angles: count,
      levels: cut.levelDb.length,
    });
  }
  for (let k = 0; k < count; k += 1) {
    checkAngle(cut.anglesDeg, k);
    const levelDb = cut.levelDb[k]!;
    if (!(Math.abs(levelDb) <= largestLevelDb)) {
      throw new PatternError(
        `The level at ${cut.anglesDeg[k]}° is ${levelDb} dB; leave out samples that hold no level.`,
        { index: k, levelDb: String(levelDb) },
      );
    }
  }
  const spanDeg = cut.anglesDeg[count - 1]! - cut.anglesDeg[0]!;
  if (spanDeg > 360 - (cut.periodic ? smallestStepDeg : 0)) {
    throw new PatternError(
      `The cut covers ${spanDeg}°; a full turn keeps its end once (cutFromSamples merges it).`,
      { spanDeg },
    );
  }
  return cut;
}

function checkAngle(anglesDeg: Float64Array, k: number): void {
  const angleDeg = anglesDeg[k]!;
  if (!(Math.abs(angleDeg) <= 1e6)) {
    throw new PatternError(`Angle ${k} is ${angleDeg}; hand in finite degrees.`, {
      index: k,
      angleDeg: String(angleDeg),
    });
  }
  if (k === 0) return;
  const stepDeg = angleDeg - anglesDeg[k - 1]!;
  if (stepDeg >= smallestStepDeg) return;
  const what = Math.abs(stepDeg) < smallestStepDeg ? 'is there twice' : 'is out of order';
  throw new PatternError(`Angle ${angleDeg}° ${what}; hand in each angle once, in order of travel.`, {
    index: k,
    angleDeg,
    before: anglesDeg[k - 1]!,
  });
}

/** The samples with ascending, unwrapped angles and levels for all. */
class OrderedSamples {
  readonly anglesDeg: Float64Array;
  readonly levelDb: Float64Array;
  readonly trace: Float64Array | undefined;
  /** The travel ran towards smaller angles. */
  readonly reversed: boolean;

  constructor(
    anglesDeg: Float64Array,
    levelDb: Float64Array,
    trace: Float64Array | undefined,
    reversed: boolean,
  ) {
    this.anglesDeg = anglesDeg;
    this.levelDb = levelDb;
    this.trace = trace;
    this.reversed = reversed;
  }

  cut(periodic: boolean): Cut {
    const { anglesDeg, levelDb, trace } = this;
    return trace ? { anglesDeg, levelDb, trace, periodic } : { anglesDeg, levelDb, periodic };
  }

  /** The samples at these places, in this order, with other angles. */
  taken(order: readonly number[], anglesDeg: Float64Array): OrderedSamples {
    const { levelDb, trace } = this;
    return new OrderedSamples(
      anglesDeg,
      Float64Array.from(order, (k) => levelDb[k]!),
      trace && Float64Array.from(order.flatMap((k) => [trace[2 * k]!, trace[2 * k + 1]!])),
      this.reversed,
    );
  }
}

function orderedSamples(samples: CutSamples): OrderedSamples {
  const unwrapped = unwrapDeg(samples.anglesDeg);
  const count = unwrapped.length;
  const trace = samples.trace && Float64Array.from(samples.trace);
  const levels = samples.levelDb ? Float64Array.from(samples.levelDb) : trace && traceLevelDb(trace);
  if (count < 3 || levels?.length !== count || (trace && trace.length !== 2 * count)) {
    throw new PatternError('Hand in three or more angles, each with one level or one complex value.', {
      angles: count,
      levels: levels?.length ?? 0,
    });
  }
  const reversed = unwrapped[count - 1]! < unwrapped[0]!;
  const order = Array.from({ length: count }, (_, k) => (reversed ? count - 1 - k : k));
  const given = new OrderedSamples(unwrapped, levels, trace, reversed);
  const ordered = reversed ? given.taken(order, unwrapped.slice().reverse()) : given;
  for (let k = 0; k < count; k += 1) checkAngle(ordered.anglesDeg, k);
  return ordered;
}

function mergedEnds(given: OrderedSamples): OrderedSamples {
  const last = given.anglesDeg.length - 1;
  const kept = Array.from({ length: last }, (_, k) => k);
  const merged = given.taken(kept, given.anglesDeg.slice(0, last));
  merged.levelDb[0] = (given.levelDb[0]! + given.levelDb[last]!) / 2;
  if (given.trace && merged.trace) {
    merged.trace[0] = (given.trace[0]! + given.trace[2 * last]!) / 2;
    merged.trace[1] = (given.trace[1]! + given.trace[2 * last + 1]!) / 2;
    merged.levelDb[0] = traceLevelDb(merged.trace.slice(0, 2))[0]!;
  }
  return merged;
}

function turnedCut(given: OrderedSamples): Cut {
  const wrapped = Array.from(given.anglesDeg, wrapDeg);
  const order = wrapped.map((_, k) => k).sort((a, b) => wrapped[a]! - wrapped[b]!);
  return given
    .taken(
      order,
      Float64Array.from(order, (k) => wrapped[k]!),
    )
    .cut(true);
}

function stepsDeg(anglesDeg: Float64Array): { smallest: number; largest: number } {
  let smallest = Number.POSITIVE_INFINITY;
  let largest = 0;
  for (let k = 1; k < anglesDeg.length; k += 1) {
    const stepDeg = anglesDeg[k]! - anglesDeg[k - 1]!;
    smallest = Math.min(smallest, stepDeg);
    largest = Math.max(largest, stepDeg);
  }
  return { smallest, largest };
}

function opposite(found: Closure): Closure {
  const turn = (figure: Closure['levelDb']) =>
    figure.kind === 'value' ? { ...figure, value: 0 - figure.value } : figure;
  return { levelDb: turn(found.levelDb), phaseDeg: turn(found.phaseDeg) };
}
