// Bringing everything to rest, and proof of it. What each level costs on a position-report controller:
//
//   at rest     M400, two positions alike                      nothing
//   moving      M410: pulses end without a ramp                the reference: the shaft may have run on
//   homing      M410 as well, which some builds answer by      the reference, and perhaps the reset button
//               halting, as they do where a switch is missing
//   no proof    M112: the controller halts                     its reset button
//
// Without an emergency parser these are read when their line is taken: at once while fewer lines wait than the
// queue holds, and we never have more than one. There is no gentle stop of a move under way in this family.

import { DriverError, isDriverError } from '../errors.ts';
import type { Underway } from './operation-turns.ts';
import type { StopReport } from './positioner.ts';
import { longestMotionMs, type ReportParts, restingPlace } from './report-parts.ts';

const quickStop = 'M410';
const emergencyStop = 'M112';
/** The `ok` of a quick stop comes after a second. */
const quickStopMs = 6_000;
/** A barrier is answered at once where nothing moves. */
const restWithinMs = 1_500;
const haltMs = 2_000;

/** See Positioner.stop. Sends its first bytes before it first yields. */
export async function stopReportAxes(parts: ReportParts, underway: Underway): Promise<StopReport> {
  const calledMs = parts.clock.monotonicMs();
  try {
    if (parts.link.isOpen) {
      sendFirst(parts, underway);
      try {
        return await comeToRest(parts, underway, calledMs);
      } catch (error) {
        if (!isDriverError(error, 'LINK_CLOSED')) throw error;
      }
    }
    await parts.link.open();
    try {
      sendFirst(parts, 'move');
      return await comeToRest(parts, 'move', calledMs);
    } finally {
      await parts.link.close();
    }
  } catch (error) {
    throw new DriverError(
      'POSITIONER_STOP_UNCONFIRMED',
      `${parts.link.name}: no proof that the axes stand still`,
      { underway, waitedMs: parts.clock.monotonicMs() - calledMs },
      error,
    );
  }
}

function sendFirst(parts: ReportParts, underway: Underway): void {
  if (underway === 'nothing' || parts.sender.halted !== undefined) return;
  parts.reference.lose(
    new DriverError('POSITIONER_REFERENCE_LOST', `${parts.link.name} was stopped dead in motion`, {
      underway,
    }),
    true,
  );
  parts.sender.urgent(quickStop);
}

async function comeToRest(parts: ReportParts, underway: Underway, calledMs: number): Promise<StopReport> {
  if (parts.sender.halted !== undefined) return halted(parts, calledMs);
  const limitMs = parts.stopsAtOnce ? quickStopMs : longestMotionMs(parts) * 1.5 + quickStopMs;
  try {
    if (underway !== 'nothing') await makeSureOfQuickStop(parts, limitMs);
    const position = await restingPlace(parts, limitMs);
    return { position, haltMs: parts.clock.monotonicMs() - calledMs };
  } catch (error) {
    if (parts.sender.halted !== undefined) return halted(parts, calledMs);
    // A restart ends every motion; where it left the axes the controller does not know.
    if (isDriverError(error, 'POSITIONER_RESTARTED')) return afterRestart(parts, calledMs);
    if (underway === 'nothing' || !parts.link.isOpen) throw error;
    return await killed(parts, calledMs, error);
  }
}

/** The quick stop goes without a number, and may be lost: what still moves is stopped again. */
async function makeSureOfQuickStop(parts: ReportParts, limitMs: number): Promise<void> {
  await parts.sender.resync(undefined, limitMs);
  try {
    await parts.sender.line('M400', { withinMs: restWithinMs, limitMs: restWithinMs });
  } catch (error) {
    if (!isDriverError(error, 'POSITIONER_NOT_ANSWERING', 'POSITIONER_STALLED')) throw error;
    parts.sender.urgent(quickStop);
    await parts.sender.resync(undefined, limitMs);
  }
}

async function afterRestart(parts: ReportParts, calledMs: number): Promise<StopReport> {
  const position = await restingPlace(parts, quickStopMs);
  return { position, haltMs: parts.clock.monotonicMs() - calledMs };
}

async function killed(parts: ReportParts, calledMs: number, cause: unknown): Promise<StopReport> {
  parts.sender.urgent(emergencyStop);
  const untilMs = parts.clock.monotonicMs() + haltMs;
  while (parts.sender.halted === undefined) {
    if (parts.clock.monotonicMs() >= untilMs) throw cause;
    await parts.clock.sleep(50);
  }
  return halted(parts, calledMs);
}

/** Nothing moves any more, and nothing will be answered: the last known place is all there is. */
function halted(parts: ReportParts, calledMs: number): StopReport {
  return { position: parts.reference.lastRest ?? {}, haltMs: parts.clock.monotonicMs() - calledMs };
}
