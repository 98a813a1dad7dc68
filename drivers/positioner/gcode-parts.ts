// What the procedures of the positioner (connect, home, move, stop) work with, and the small steps they share:
// a report with a position, waiting for rest.
import type { Clock } from '../clock.ts';
import { DriverError, isDriverError } from '../errors.ts';
import type { Link } from '../link/link.ts';
import { alarmError } from './gcode-failures.ts';
import type { GcodeReference, Placed } from './gcode-reference.ts';
import { type ControllerLine, isHeld, isMoving } from './gcode-reports.ts';
import type { GcodeSender } from './gcode-sender.ts';
import type { Settings } from './gcode-settings.ts';
import type { AxisSetup, Position } from './positioner.ts';
import { motionSeconds } from './travel.ts';

/**
 * Proof against a restart unseen, see gcode-memory.ts. `missing`: not set since the last reset, or the answer was
 * lost on the way; `impossible`: the controller does not keep or print it, so that much that is sure elsewhere has
 * to be taken for a restart.
 */
export type MemoryMark = 'set' | 'missing' | 'impossible';

export interface GcodeParts {
  axes: readonly AxisSetup[];
  link: Link;
  clock: Clock;
  sender: GcodeSender;
  reference: GcodeReference;
  /** As read at connection; empty before. */
  settings: Settings;
  memoryMark: MemoryMark;
  /** Whether the mark of an earlier session was found when the controller was first met. */
  countUnbroken?: boolean;
}

export const lineWithinMs = 2_000;
export const pollMs = 200;
const offsetReports = 40;

/**
 * A line that may be said twice without harm, and is where its answer does not come: a busy controller answers
 * late, a wire loses some. Throws what GcodeSender.line throws.
 */
export async function askTwice(
  parts: GcodeParts,
  text: string,
  signal: AbortSignal | undefined,
  withinMs = lineWithinMs,
): Promise<ControllerLine[]> {
  try {
    return await parts.sender.line(text, { withinMs, signal });
  } catch (error) {
    if (!isDriverError(error, 'POSITIONER_NOT_ANSWERING')) throw error;
    return parts.sender.line(text, { withinMs, signal });
  }
}

/** A fresh report with a position in degrees. The offset of work positions comes with every tenth report or so. */
export async function readPlaced(parts: GcodeParts, signal?: AbortSignal): Promise<Placed> {
  for (let asked = 0; asked < offsetReports; asked += 1) {
    const { report, monotonicMs } = await parts.sender.report(signal);
    const placed = parts.reference.place(report, monotonicMs);
    if (placed) return placed;
    const axisCount = (report.machine ?? report.work)?.length ?? 0;
    if (report.machine) throw missingAxis(parts, axisCount);
    await parts.clock.sleep(pollMs / 4, signal);
  }
  throw new DriverError(
    'POSITIONER_BAD_ANSWER',
    `${parts.link.name} reports work positions and never their offset`,
    { reports: offsetReports },
  );
}

function missingAxis(parts: GcodeParts, axisCount: number): DriverError {
  const letters = parts.reference.letters.slice(0, axisCount);
  const axis = parts.axes.find((candidate) => !letters.includes(candidate.word));
  return new DriverError(
    'POSITIONER_UNEXPECTED_CONTROLLER',
    `${parts.link.name} has the axes ${letters}, not ${axis?.word ?? 'those of the range'}`,
    { axes: letters, wanted: parts.axes.map((each) => each.word).join('') },
  );
}

/** Waits until nothing moves of itself any more (a hold released by hand, a jog) and refuses what waits for a person. */
export async function awaitRest(parts: GcodeParts, signal?: AbortSignal): Promise<Placed> {
  const deadlineMs = parts.clock.monotonicMs() + longestMotionMs(parts) * 1.5 + 5_000;
  for (;;) {
    const placed = await readPlaced(parts, signal);
    const { report } = placed;
    if (report.state === 'Alarm') throw alarmMet(parts);
    const late = parts.clock.monotonicMs() > deadlineMs;
    if (isHeld(report) || late || (!isMoving(report) && report.state !== 'Idle')) {
      throw new DriverError(
        'POSITIONER_HELD',
        `${parts.link.name} is in ${report.stateText} and waits for somebody at the machine`,
        { state: report.stateText },
      );
    }
    if (report.state === 'Idle' && !parts.reference.suspectsRestart) return placed;
    await parts.clock.sleep(pollMs, signal);
  }
}

/** What to throw for a report in alarm; one that was not told may come of anything, a restart included. */
export function alarmMet(parts: GcodeParts): DriverError {
  const error = alarmError(parts.reference.alarm, parts.link.name);
  if (parts.reference.alarm === undefined) parts.reference.lose(error, true);
  return error;
}

function longestMotionMs(parts: GcodeParts): number {
  const seconds = parts.axes.map((axis) => {
    const limit = parts.reference.limits[axis.name] ?? axis;
    return motionSeconds(
      axis.travelMaxDeg - axis.travelMinDeg,
      limit.rateDegPerS,
      limit.accelerationDegPerS2,
    );
  });
  return Math.max(0, ...seconds) * 1000;
}

/** The longest any axis takes to come to rest from its full rate. */
export function brakingMs(parts: GcodeParts): number {
  const seconds = parts.axes.map((axis) => {
    const limit = parts.reference.limits[axis.name] ?? axis;
    return limit.rateDegPerS / limit.accelerationDegPerS2;
  });
  return Math.max(0, ...seconds) * 1000;
}

export function samePlace(axes: readonly AxisSetup[], a: Position, b: Position): boolean {
  return axes.every((axis) => a[axis.name] === b[axis.name]);
}
