// Making the coordinates true on a position-report controller: its homing cycle for axes with a switch; an axis
// without one is believed at the controller's zero, unless a restart or a quick stop may have moved that zero.
// A switch that is never found halts the controller for good: POSITIONER_ALARM.
import { demandContinuity } from './axis-continuity.ts';
import { longestMotionMs, type ReportParts, restingPlace, setModes } from './report-parts.ts';

export interface ReportHomeOptions {
  believeZeroAfterRestart: boolean;
  /** Called right before the cycle begins to move. */
  onMotion: () => void;
}

/** Homing goes at the controller's own pace, which is not told: what is slow is waited for while it is busy. */
const slowest = 10;
const homingMinMs = 150_000;

export async function homeReportAxes(
  parts: ReportParts,
  options: ReportHomeOptions,
  signal: AbortSignal,
): Promise<void> {
  const restMs = longestMotionMs(parts) * 1.5 + 5_000;
  await restingPlace(parts, restMs, signal);
  const homingMs = Math.max(longestMotionMs(parts) * slowest, homingMinMs);
  for (const axis of parts.axes) {
    if (axis.homing !== 'switch') continue;
    await parts.sender.line(`G28 ${axis.word}`, {
      withinMs: longestMotionMs(parts) * 1.5 + 10_000,
      limitMs: homingMs,
      signal,
      onSend: options.onMotion,
    });
  }
  // A restart since, or homing itself, may have left other modes.
  await setModes(parts, signal);
  const position = await restingPlace(parts, homingMs, signal);
  if (!options.believeZeroAfterRestart) demandContinuity(parts.axes, parts.reference, position);
  parts.reference.trust(position);
  parts.reference.publish(position, false);
}
