// Bringing everything to rest, and proof of it. The first bytes leave before anything is awaited.
//
//   moving:   !  ──►  Hold:1 … Hold:0  ──►  soft reset  ──►  banner  ──►  two reports alike     position kept
//   no hold in time, or nothing answered:    soft reset  ──►  …                               position doubtful
//   at rest:  ?  ──►  two reports alike; no hold, which would lock an idle controller

import { DriverError, isDriverError } from '../errors.ts';
import { urgentBytes } from './gcode-events.ts';
import { fallToZero, noteMemory, setModes } from './gcode-memory.ts';
import { brakingMs, type GcodeParts, pollMs, readPlaced, samePlace } from './gcode-parts.ts';
import type { Placed } from './gcode-reference.ts';
import { isHeld, isMoving } from './gcode-reports.ts';
import type { Underway } from './operation-turns.ts';
import type { StopReport } from './positioner.ts';

const holdGraceMs = 1_500;
const reopenGraceMs = 5_000;
const bannerMs = 3_000;
const stopPollMs = 80;
const repeatHoldMs = 300;
const confirmTries = 10;

/** What may be turning when the stop is called. */
/** See Positioner.stop. Sends its first bytes before it first yields. */
export async function stopAxes(parts: GcodeParts, underway: Underway): Promise<StopReport> {
  const calledMs = parts.clock.monotonicMs();
  if (parts.link.isOpen) sendFirst(parts, underway);
  try {
    if (parts.link.isOpen) {
      try {
        return await comeToRest(parts, underway, calledMs, 0);
      } catch (error) {
        // The wire failed meanwhile; another connection may still tell.
        if (!isDriverError(error, 'LINK_CLOSED')) throw error;
      }
    }
    return await stopOverNewLink(parts, calledMs);
  } catch (error) {
    throw new DriverError(
      'POSITIONER_STOP_UNCONFIRMED',
      `${parts.link.name}: no proof that the axes stand still`,
      { underway, waitedMs: parts.clock.monotonicMs() - calledMs },
      error,
    );
  }
}

/** Opened only for the stop, and closed behind it: whoever wants to go on connects with identify(). */
async function stopOverNewLink(parts: GcodeParts, calledMs: number): Promise<StopReport> {
  if (!parts.link.isOpen) await parts.link.open();
  try {
    sendFirst(parts, 'move');
    return await comeToRest(parts, 'move', calledMs, reopenGraceMs);
  } finally {
    await parts.link.close();
  }
}

function sendFirst(parts: GcodeParts, underway: Underway): void {
  if (underway === 'move') parts.sender.urgent(urgentBytes.hold, urgentBytes.report);
  else if (underway === 'nothing') parts.sender.urgent(urgentBytes.report);
}

async function comeToRest(
  parts: GcodeParts,
  underway: Underway,
  calledMs: number,
  graceMs: number,
): Promise<StopReport> {
  // A homing cycle takes no notice of a hold; only a reset ends it, and it leaves in the turn of the call.
  if (underway === 'homing') return resetHard(parts, calledMs);
  let mayMove = underway === 'move';
  if (!mayMove) {
    const answer = await firstReport(parts);
    if (!answer) return resetHard(parts, calledMs);
    if (isMoving(answer.report)) {
      parts.sender.urgent(urgentBytes.hold);
      mayMove = true;
    } else if (!isHeld(answer.report)) {
      const report = await confirm(parts, calledMs);
      // Without a reset of ours the mark must still be there.
      if (answer.report.state === 'Idle') await whereAnswered(parts, noteMemory);
      return report;
    }
  }
  const rest = await awaitHold(parts, brakingMs(parts) + holdGraceMs + graceMs);
  if (rest === undefined) return resetHard(parts, calledMs);
  if (rest.report.state === 'Alarm') return confirm(parts, calledMs, rest);
  await parts.sender.reset(bannerMs);
  const report = await confirm(parts, calledMs, rest);
  await markMemoryAgain(parts);
  return report;
}

async function firstReport(parts: GcodeParts): ReturnType<GcodeParts['sender']['askReport']> {
  for (let tried = 0; tried < 3; tried += 1) {
    const answer = await parts.sender.askReport(stopPollMs * 5);
    if (answer) return answer;
  }
  return undefined;
}

/** The report that shows rest after a hold; undefined when none did in time. */
async function awaitHold(parts: GcodeParts, withinMs: number): Promise<Placed | undefined> {
  const startedMs = parts.clock.monotonicMs();
  let holdSentMs = startedMs;
  let before: Placed | undefined;
  for (;;) {
    const answer = await parts.sender.askReport(stopPollMs * 4);
    const nowMs = parts.clock.monotonicMs();
    const placed = answer && parts.reference.place(answer.report, answer.monotonicMs);
    if (placed && showsRest(parts, placed, before)) return placed;
    before = placed;
    const runsOn = placed?.report.state === 'Run' || placed?.report.state === 'Jog';
    if (runsOn && nowMs - holdSentMs >= repeatHoldMs) {
      // The byte was lost on the wire.
      parts.sender.urgent(urgentBytes.hold);
      holdSentMs = nowMs;
    }
    if (nowMs - startedMs >= withinMs) return undefined;
    await parts.clock.sleep(stopPollMs);
  }
}

/** `Idle` once proves nothing: it is also said just before a move begins, but then twice at different places. */
function showsRest(parts: GcodeParts, placed: Placed, before: Placed | undefined): boolean {
  if (placed.report.state === 'Home' || isMoving(placed.report)) return false;
  // `Hold` without a number does not tell whether it has come to a halt.
  const { state, sub } = placed.report;
  if (state !== 'Idle' && (state !== 'Hold' || sub !== undefined)) return true;
  return before?.report.state === state && samePlace(parts.axes, before.position, placed.position);
}

/** Pulses end at once; the motors may run on, so that nothing is known of the position afterwards. */
async function resetHard(parts: GcodeParts, calledMs: number): Promise<StopReport> {
  parts.reference.lose(
    new DriverError('POSITIONER_REFERENCE_LOST', `${parts.link.name} was reset while it may have moved`, {
      link: parts.link.name,
    }),
    true,
  );
  await parts.sender.reset(bannerMs);
  return confirm(parts, calledMs);
}

/** Two reports alike, a poll apart. `rest`: the report that first showed the halt, if there was one. */
async function confirm(parts: GcodeParts, calledMs: number, rest?: Placed): Promise<StopReport> {
  let before = await readPlaced(parts);
  for (let tried = 0; tried < confirmTries; tried += 1) {
    await parts.clock.sleep(stopPollMs);
    const now = await readPlaced(parts);
    const stands = !isMoving(now.report) && samePlace(parts.axes, before.position, now.position);
    if (stands) {
      return { position: now.position, haltMs: (rest ?? before).monotonicMs - calledMs };
    }
    before = now;
  }
  throw new DriverError('POSITIONER_STOP_UNCONFIRMED', `${parts.link.name} goes on moving`, {
    state: before.report.stateText,
    waitedMs: confirmTries * stopPollMs + pollMs,
  });
}

/**
 * After a reset of our own. The mark is gone with it, and with the mark the proof against a restart unseen just
 * before: there only the fall of the position to zero is left.
 */
async function markMemoryAgain(parts: GcodeParts): Promise<void> {
  const { last } = parts.reference;
  if (last?.report.state !== 'Idle') return;
  fallToZero(parts, last);
  await whereAnswered(parts, setModes);
}

/** The axes stand, whether or not this is answered; the mark is then set before the next move. */
async function whereAnswered(parts: GcodeParts, act: (parts: GcodeParts) => Promise<void>): Promise<void> {
  try {
    await act(parts);
  } catch (error) {
    if (!isDriverError(error)) throw error;
    parts.memoryMark = 'missing';
  }
}
