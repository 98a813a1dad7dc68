// What the procedures of the positioner (connect, home, move, stop) work with, and the small steps they share:
// a report with a position, waiting for rest, the memory mark that betrays an unseen restart.
import type { Clock } from '../clock.ts';
import { DriverError, isDriverError } from '../errors.ts';
import type { Link } from '../link/link.ts';
import type { GcodeReference, Placed } from './gcode-reference.ts';
import { type ControllerLine, isHeld, isMoving, planeInParserState } from './gcode-reports.ts';
import { alarmError, type GcodeSender } from './gcode-sender.ts';
import type { Settings } from './gcode-settings.ts';
import type { AxisSetup, Position } from './positioner.ts';
import { motionSeconds } from './travel.ts';

export interface GcodeParts {
  axes: readonly AxisSetup[];
  link: Link;
  clock: Clock;
  sender: GcodeSender;
  reference: GcodeReference;
  /** As read at connection; empty before. */
  settings: Settings;
  /** The controller remembers the plane we set and prints it, so that a lost memory can be noticed. */
  memoryMark: boolean;
}

export const lineWithinMs = 2_000;
export const pollMs = 200;
const offsetReports = 40;

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
    if (report.state === 'Alarm') throw alarmError(parts.reference.alarm, parts.link.name);
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

/** A plane that no controller starts in and no straight move asks for. */
const markPlane = 18;
/** A print-out may be damaged on the wire. */
const planeQuestions = 3;

/**
 * Modes, and a plane as the memory mark: it stands in the parser state until the controller restarts, since
 * motion lines, which carry their own modes, never name one. To be sent after every restart or reset.
 */
export async function setModes(parts: GcodeParts, signal?: AbortSignal): Promise<void> {
  await parts.sender.line(`G${markPlane} G21 G90 G94`, { withinMs: lineWithinMs, signal });
  parts.memoryMark = (await askPlane(parts, signal)) === markPlane;
}

/** The plane in the parser state; undefined where three print-outs do not show it. */
async function askPlane(parts: GcodeParts, signal?: AbortSignal): Promise<number | undefined> {
  for (let asked = 0; asked < planeQuestions; asked += 1) {
    const plane = planeIn(await parts.sender.line('$G', { withinMs: lineWithinMs, signal }));
    if (plane !== undefined) return plane;
  }
  return undefined;
}

function planeIn(lines: readonly ControllerLine[]): number | undefined {
  for (const line of lines) {
    if (line.kind === 'data' && line.key === 'GC') return planeInParserState(line.value);
  }
  return undefined;
}

/** Throws POSITIONER_RESTARTED if the controller's memory is gone: its banner, and what it did to the position, may go unseen. */
export async function checkMemory(parts: GcodeParts, signal?: AbortSignal): Promise<void> {
  if (!parts.memoryMark) return;
  try {
    demandMark(parts, await askPlane(parts, signal));
  } catch (error) {
    if (!isDriverError(error, 'POSITIONER_NOT_ANSWERING')) throw error;
    await resyncAndCheckMemory(parts, signal);
  }
}

/** As `checkMemory`, where a restart is no failure: the reference remembers it for the next move. */
export async function noteMemory(parts: GcodeParts, signal?: AbortSignal): Promise<void> {
  try {
    await checkMemory(parts, signal);
  } catch (error) {
    if (!isDriverError(error, 'POSITIONER_RESTARTED')) throw error;
  }
}

/** After a lost answer: agrees with the controller again, and checks its memory. */
export async function resyncAndCheckMemory(parts: GcodeParts, signal?: AbortSignal): Promise<void> {
  const lines = await parts.sender.resync(signal);
  if (parts.memoryMark) demandMark(parts, planeIn(lines) ?? (await askPlane(parts, signal)));
}

function demandMark(parts: GcodeParts, plane: number | undefined): void {
  if (plane === markPlane) return;
  if (plane === undefined) {
    throw new DriverError(
      'POSITIONER_BAD_ANSWER',
      `${parts.link.name} does not print its modes any more: a restart could not be told`,
      { asked: planeQuestions },
    );
  }
  throw restartedUnseen(parts, 'it has forgotten its modes');
}

/** The error of a restart that no banner told of; the reference is lost with it. */
export function restartedUnseen(parts: GcodeParts, because: string): DriverError {
  const error = new DriverError('POSITIONER_RESTARTED', `${parts.link.name} restarted unseen: ${because}`, {
    link: parts.link.name,
  });
  parts.reference.lose(error, true);
  return error;
}

export function samePlace(axes: readonly AxisSetup[], a: Position, b: Position): boolean {
  return axes.every((axis) => a[axis.name] === b[axis.name]);
}
