// One straight move of a position-report controller, and the knowledge that it has ended.
//
//   G90  G1 …  │ the planned time passes; positions are asked for │  M400 … ok  │  M114 → fresh position
//
// The barrier leaves only when the plan says that the move must be about over: until then the controller answers
// what it is asked, and nothing stands before a stop on builds that read it in turn.
import { DriverError, isDriverError } from '../errors.ts';
import type { AxisSetup, Position } from './positioner.ts';
import { askPosition, barrier, lineWithinMs, type ReportParts, samePlace, sayTwice } from './report-parts.ts';
import { legMotion, plainMotionLine } from './travel.ts';

const askEveryMs = 250;
/** Where positions in motion are not true they still prove that the controller is alive. */
const aliveEveryMs = 1_000;
const attempts = 2;

/** Drives one leg from `fromDeg`, where the axes rest, and returns where they rest then. */
export async function driveReportLeg(
  parts: ReportParts,
  fromDeg: Position,
  toDeg: Position,
  onMotion: () => void,
  signal: AbortSignal,
): Promise<Position> {
  let atDeg = fromDeg;
  for (let attempt = 1; ; attempt += 1) {
    try {
      const motion = legMotion(parts.axes, parts.limits, atDeg, toDeg);
      const plannedMs = motion.seconds * 1000;
      await sayTwice(parts, 'G90', signal);
      const line = plainMotionLine(parts.axes, toDeg, motion.feedUnitsPerMin);
      signal.throwIfAborted();
      await parts.sender.line(line, { withinMs: lineWithinMs, signal, onSend: onMotion });
      parts.reference.publish(atDeg, true);
      await watchPlan(parts, { fromDeg: atDeg, toDeg, plannedMs }, signal);
      await barrier(parts, 0, limitFor(plannedMs), signal);
      return await readRest(parts, toDeg, signal);
    } catch (error) {
      if (!isDriverError(error, 'POSITIONER_NOT_ANSWERING') || attempt >= attempts) throw error;
      // Whether the line was taken or not: after the barrier the axes rest, and the same absolute move may be said again.
      await barrier(
        parts,
        0,
        limitFor(legMotion(parts.axes, parts.limits, atDeg, toDeg).seconds * 1000),
        signal,
      );
      atDeg = await askPosition(parts, signal);
    }
  }
}

/** No move that is under way takes longer. */
function limitFor(plannedMs: number): number {
  return plannedMs * 1.5 + 60_000;
}

interface PlannedLeg {
  fromDeg: Position;
  toDeg: Position;
  plannedMs: number;
}

/**
 * Lets the planned time pass, and tells the positions where the controller tells them truly: builds that do not
 * name the target as soon as the move has begun.
 */
async function watchPlan(parts: ReportParts, leg: PlannedLeg, signal: AbortSignal): Promise<void> {
  const endMs = parts.clock.monotonicMs() + leg.plannedMs;
  const isAtEnd = (position: Position): boolean =>
    parts.axes.every((axis) => isNear(axis, position, leg.toDeg));
  let tellsTruth = false;
  for (let asked = 0; ; asked += 1) {
    const leftMs = endMs - parts.clock.monotonicMs();
    const everyMs = asked === 0 ? 0 : tellsTruth ? askEveryMs : aliveEveryMs;
    if (leftMs <= everyMs) {
      await parts.clock.sleep(Math.max(0, leftMs), signal);
      return;
    }
    await parts.clock.sleep(everyMs, signal);
    const position = await askInMotion(parts, signal);
    if (!position) continue;
    if (asked === 0) tellsTruth = !isAtEnd(position);
    if (!tellsTruth) continue;
    if (isAtEnd(position)) return;
    if (isOnTheWay(parts.axes, leg, position)) parts.reference.publish(position, true);
  }
}

async function askInMotion(parts: ReportParts, signal: AbortSignal): Promise<Position | undefined> {
  const lines = await sayTwice(parts, 'M114 R', signal, { needsPosition: true });
  const line = lines.findLast((each) => each.kind === 'position');
  return line?.kind === 'position' ? parts.reference.place(line) : undefined;
}

/** The position behind the barrier, asked for now. Throws POSITIONER_WRONG_PLACE. */
async function readRest(parts: ReportParts, toDeg: Position, signal: AbortSignal): Promise<Position> {
  let before: Position | undefined;
  for (;;) {
    const position = await askPosition(parts, signal);
    const off = parts.axes.find((axis) => !isNear(axis, position, toDeg));
    if (!off) {
      parts.reference.publish(position, false);
      return position;
    }
    // A report can be damaged into another one; a place that is wrong stays wrong.
    if (before && samePlace(parts.axes, before, position)) {
      throw new DriverError(
        'POSITIONER_WRONG_PLACE',
        `${off.name} is at ${position[off.name]}°, not at ${toDeg[off.name]}°`,
        {
          axis: off.name,
          targetDeg: toDeg[off.name] ?? 'none',
          readBackDeg: position[off.name] ?? 'none',
        },
      );
    }
    before = position;
  }
}

function isNear(axis: AxisSetup, position: Position, toDeg: Position): boolean {
  const targetDeg = toDeg[axis.name];
  if (targetDeg === undefined) return true;
  return Math.abs((position[axis.name] ?? Number.NaN) - targetDeg) <= axis.toleranceDeg;
}

function isOnTheWay(axes: readonly AxisSetup[], leg: PlannedLeg, position: Position): boolean {
  return axes.every((axis) => {
    const fromDeg = leg.fromDeg[axis.name] ?? Number.NaN;
    const toDeg = leg.toDeg[axis.name] ?? fromDeg;
    const atDeg = position[axis.name] ?? Number.NaN;
    return (
      atDeg >= Math.min(fromDeg, toDeg) - axis.toleranceDeg &&
      atDeg <= Math.max(fromDeg, toDeg) + axis.toleranceDeg
    );
  });
}
