// One straight move, and the knowledge that it has ended: line, barrier, reports meanwhile; then the fresh
// read-back. An answer that got lost on the wire is made good by sending the same absolute move again.
import { DriverError, isDriverError } from '../errors.ts';
import { restartedUnseen, resyncAndCheckMemory } from './gcode-memory.ts';
import { type GcodeParts, lineWithinMs, pollMs, readPlaced } from './gcode-parts.ts';
import { isZero, type Placed } from './gcode-reference.ts';
import { type Leg, LegWatch } from './leg-watch.ts';
import type { AxisSetup, Position } from './positioner.ts';
import { legMotion, motionLine } from './travel.ts';

/** Its `ok` comes when the planner is empty and the motors stand: the controller's only proof of an end. */
const barrier = 'G4 P0.01';
/** Three questions in a row without an answer. */
const silenceMs = 3_000;
const readBackTries = 3;
const attempts = 2;

/**
 * Drives one leg to its end. `atDeg`: where the axes are known to stand; from elsewhere nothing is sent
 * (POSITIONER_WRONG_PLACE). `onMotion` is called right before the line that moves leaves.
 */
export async function driveLeg(
  parts: GcodeParts,
  atDeg: Position,
  toDeg: Position,
  onMotion: () => void,
  signal: AbortSignal,
): Promise<void> {
  for (let attempt = 1; ; attempt += 1) {
    const from = attempt === 1 ? await readBack(parts, atDeg, signal) : await readPlaced(parts, signal);
    const motion = legMotion(parts.axes, parts.reference.limits, from.position, toDeg);
    const line = motionLine(parts.axes, toDeg, motion.feedUnitsPerMin);
    try {
      signal.throwIfAborted();
      await parts.sender.line(line, { withinMs: lineWithinMs, signal, onSend: onMotion });
      const leg = { fromDeg: from.position, toDeg, plannedMs: motion.seconds * 1000 };
      await awaitBarrier(parts, leg, signal);
      return;
    } catch (error) {
      if (!isDriverError(error, 'POSITIONER_NOT_ANSWERING') || attempt >= attempts) throw error;
      await awaitStandstill(parts, toDeg, from.position, signal);
      await resyncAndCheckMemory(parts, signal);
      if (parts.memoryMark !== 'set') await demandNoFallToZero(parts, signal);
    }
  }
}

/** Where no mark tells of a restart, a move that ended at zero without an answer is not repeated from there. */
async function demandNoFallToZero(parts: GcodeParts, signal: AbortSignal): Promise<void> {
  const { machine } = await readPlaced(parts, signal);
  if (isZero(machine)) throw restartedUnseen(parts, 'it is at zero and owes an answer');
}

/** Sends the barrier and watches the reports until it is answered. A lost answer: POSITIONER_NOT_ANSWERING. */
async function awaitBarrier(parts: GcodeParts, leg: Leg, signal: AbortSignal): Promise<void> {
  const watch = new LegWatch(parts.axes, leg, parts.clock.monotonicMs());
  const ended = new AbortController();
  const both = AbortSignal.any([signal, ended.signal]);
  const answered = parts.sender.line(barrier, { withinMs: watch.limitMs * 2, signal: both });
  const watched = watchReports(parts, watch, both);
  try {
    await Promise.race([answered, watched]);
    if (parts.memoryMark !== 'set' && watch.endedTooSoon(parts.clock.monotonicMs())) {
      throw restartedUnseen(parts, 'a move ended sooner than it can');
    }
  } finally {
    ended.abort(new DriverError('POSITIONER_NOT_ANSWERING', 'the watch over a move has ended'));
    await Promise.allSettled([answered, watched]);
  }
}

/** Asks for reports while a move runs; only ever ends by throwing. */
async function watchReports(parts: GcodeParts, watch: LegWatch, signal: AbortSignal): Promise<never> {
  let heardMs = parts.clock.monotonicMs();
  for (;;) {
    const answer = await parts.sender.askReport(pollMs * 2, signal);
    const nowMs = parts.clock.monotonicMs();
    const placed = answer && parts.reference.place(answer.report, answer.monotonicMs);
    if (placed) {
      heardMs = nowMs;
      const verdict = watch.judge(placed);
      if (verdict.kind === 'fault') throw verdict.error;
      if (verdict.kind === 'answer lost') throw notAnswering('the answer to a barrier was lost', placed);
    } else if (nowMs - heardMs >= silenceMs) {
      throw new DriverError('POSITIONER_NOT_ANSWERING', 'no status report during a move', { silenceMs });
    }
    await parts.clock.sleep(pollMs, signal);
  }
}

/** The line may have been taken although its answer was lost: waits for its end before anything is repeated. */
async function awaitStandstill(
  parts: GcodeParts,
  toDeg: Position,
  fromDeg: Position,
  signal: AbortSignal,
): Promise<void> {
  const motion = legMotion(parts.axes, parts.reference.limits, fromDeg, toDeg);
  const leg = { fromDeg, toDeg, plannedMs: motion.seconds * 1000 };
  const watch = new LegWatch(parts.axes, leg, parts.clock.monotonicMs());
  for (;;) {
    const verdict = watch.judge(await readPlaced(parts, signal));
    if (verdict.kind === 'fault') throw verdict.error;
    if (verdict.kind === 'answer lost') return;
    await parts.clock.sleep(pollMs, signal);
  }
}

/** The position after the barrier, asked for now. Throws POSITIONER_WRONG_PLACE. */
export async function readBack(parts: GcodeParts, target: Position, signal: AbortSignal): Promise<Placed> {
  for (let tried = 1; ; tried += 1) {
    const placed = await readPlaced(parts, signal);
    const off = parts.axes.find((axis) => !isAt(axis, target, placed.position));
    if (!off && placed.report.state === 'Idle') return placed;
    // A report can be damaged into another one; a place that is wrong stays wrong.
    if (tried < readBackTries) {
      await parts.clock.sleep(pollMs / 4, signal);
      continue;
    }
    const axis = off?.name ?? 'none';
    throw new DriverError(
      'POSITIONER_WRONG_PLACE',
      off
        ? `${axis} is at ${placed.position[axis]}°, not at ${target[axis]}°`
        : 'the controller does not rest',
      {
        axis,
        state: placed.report.stateText,
        targetDeg: target[axis] ?? 'none',
        readBackDeg: placed.position[axis] ?? 'none',
        pins: placed.report.pins,
      },
    );
  }
}

/**
 * What a failed move may have hidden. A wrong place may come from an unseen restart, and the stop that follows
 * wipes the proof: at rest the controller's memory is asked for (throws POSITIONER_RESTARTED); in motion there is
 * no time to, and the coordinates count as lost. So they do in an alarm that nobody heard of.
 */
export async function lookIntoFailure(parts: GcodeParts, error: unknown, signal: AbortSignal): Promise<void> {
  if (isDriverError(error, 'POSITIONER_ALARM') && parts.reference.alarm === undefined) {
    parts.reference.lose(error, true);
  }
  if (!isDriverError(error, 'POSITIONER_WRONG_PLACE')) return;
  if (error.facts['state'] === 'Idle' && parts.memoryMark === 'set')
    await resyncAndCheckMemory(parts, signal);
  else parts.reference.lose(error, true);
}

function isAt(axis: AxisSetup, target: Position, position: Position): boolean {
  const targetDeg = target[axis.name];
  if (targetDeg === undefined) return true;
  return Math.abs((position[axis.name] ?? Number.NaN) - targetDeg) <= axis.toleranceDeg;
}

function notAnswering(what: string, placed: Placed): DriverError {
  return new DriverError('POSITIONER_NOT_ANSWERING', what, {
    state: placed.report.stateText,
    ...placed.position,
  });
}
