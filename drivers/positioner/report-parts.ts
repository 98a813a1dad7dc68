// What the procedures over a position-report controller work with, and the small steps they share: barrier,
// fresh position, modes.
import type { Clock } from '../clock.ts';
import { DriverError, isDriverError } from '../errors.ts';
import type { Link } from '../link/link.ts';
import type { AxisName, AxisSetup, Position } from './positioner.ts';
import { unansweredLine } from './report-failures.ts';
import type { ReportLine } from './report-lines.ts';
import type { ReportReference } from './report-reference.ts';
import type { ReportSender } from './report-sender.ts';
import { type AxisLimits, motionSeconds } from './travel.ts';

export interface ReportParts {
  axes: readonly AxisSetup[];
  link: Link;
  clock: Clock;
  sender: ReportSender;
  reference: ReportReference;
  limits: Readonly<Record<AxisName, AxisLimits>>;
  /** Quick stop and emergency stop act at once, whatever waits; as told at connection. */
  stopsAtOnce: boolean;
}

export const lineWithinMs = 2_000;
const positionTries = 3;

/** A line that may be said twice without harm, and is where its answer does not come. */
export async function sayTwice(
  parts: ReportParts,
  text: string,
  signal?: AbortSignal,
  options: { needsPosition?: boolean } = {},
): Promise<ReportLine[]> {
  try {
    return await parts.sender.line(text, { withinMs: lineWithinMs, signal, ...options });
  } catch (error) {
    if (!isDriverError(error, 'POSITIONER_NOT_ANSWERING')) throw error;
    return parts.sender.line(text, { withinMs: lineWithinMs, signal, ...options });
  }
}

/**
 * Absolute degrees, full feed, motors that are on and never go off by themselves (their delay cannot be read, so it is set
 * each time; nothing is stored), and a sign of life every 2 s during long commands.
 */
export async function setModes(parts: ReportParts, signal?: AbortSignal): Promise<void> {
  for (const mode of ['G21', 'G90', 'M220 S100', 'M84 S0', 'M17', 'M113 S2'])
    await sayTwice(parts, mode, signal);
}

/** Waits until nothing moves. `plannedMs`: what is expected to be left. */
export async function barrier(
  parts: ReportParts,
  plannedMs: number,
  limitMs: number,
  signal?: AbortSignal,
): Promise<void> {
  const withinMs = plannedMs * 1.5 + 5_000;
  try {
    await parts.sender.line('M400', { withinMs, limitMs, signal });
  } catch (error) {
    // Its answer may be lost; it may be said again without harm.
    if (!isDriverError(error, 'POSITIONER_NOT_ANSWERING')) throw error;
    await parts.sender.line('M400', { withinMs, limitMs, signal });
  }
}

/**
 * The position as reported for this very question: in motion it is the target, at rest (behind a barrier) it is
 * the truth, since the controller runs one command after the other.
 */
export async function askPosition(parts: ReportParts, signal?: AbortSignal): Promise<Position> {
  const withinMs = lineWithinMs;
  for (let tried = 0; tried < positionTries; tried += 1) {
    try {
      const lines = await parts.sender.line('M114', { withinMs, signal, needsPosition: true });
      const line = lines.findLast((each) => each.kind === 'position');
      if (line?.kind === 'position') return parts.reference.place(line);
    } catch (error) {
      // A damaged position counts as none; the question may be asked again.
      if (!isDriverError(error, 'POSITIONER_NOT_ANSWERING')) throw error;
    }
  }
  throw unansweredLine('M114', positionTries * withinMs, parts.link.name);
}

/** Barrier, then two positions alike: the axes stand there. */
export async function restingPlace(
  parts: ReportParts,
  limitMs: number,
  signal?: AbortSignal,
): Promise<Position> {
  await barrier(parts, 0, limitMs, signal);
  const first = await askPosition(parts, signal);
  const second = await askPosition(parts, signal);
  if (!samePlace(parts.axes, first, second)) {
    throw new DriverError('POSITIONER_BAD_ANSWER', `${parts.link.name} reports two places at rest`, {
      ...first,
    });
  }
  parts.reference.publish(second, false);
  return second;
}

export function longestMotionMs(parts: ReportParts): number {
  const seconds = parts.axes.map((axis) => {
    const limit = parts.limits[axis.name] ?? axis;
    return motionSeconds(
      axis.travelMaxDeg - axis.travelMinDeg,
      limit.rateDegPerS,
      limit.accelerationDegPerS2,
    );
  });
  return Math.max(0, ...seconds) * 1000;
}

export function samePlace(axes: readonly AxisSetup[], a: Position, b: Position): boolean {
  return axes.every((axis) => a[axis.name] === b[axis.name]);
}
