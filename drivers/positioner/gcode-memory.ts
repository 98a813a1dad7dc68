// Noticing a restart that nobody told of. The controller is given a mark that it forgets with everything else
// when it restarts, and prints when asked: a working plane that it does not start in. Its banner may be lost on
// the wire, its position may look right by chance; the mark is neither. Checked before and after every move.
import { DriverError, isDriverError } from '../errors.ts';
import { askTwice, type GcodeParts } from './gcode-parts.ts';
import type { Placed } from './gcode-reference.ts';
import { type ControllerLine, planeInParserState } from './gcode-reports.ts';

/** A plane that no controller starts in and no straight move asks for. */
const markPlane = 18;
/** A print-out may be damaged on the wire. */
const planeQuestions = 3;

/**
 * Modes, and a plane as the memory mark: it stands in the parser state until the controller restarts, since
 * motion lines, which carry their own modes, never name one. To be sent after every restart or reset.
 */
export async function setModes(parts: GcodeParts, signal?: AbortSignal): Promise<void> {
  parts.memoryMark = 'missing';
  await askTwice(parts, `G${markPlane} G21 G90 G94`, signal);
  parts.memoryMark = (await askPlane(parts, signal)) === markPlane ? 'set' : 'impossible';
}

/** Whether the mark of an earlier session still stands: the controller has not restarted since. */
export async function findMark(parts: GcodeParts, signal?: AbortSignal): Promise<boolean> {
  return (await askPlane(parts, signal)) === markPlane;
}

/** After a reset of our own: the mark is gone, and is to be set again. */
export function forgetMark(parts: GcodeParts): void {
  if (parts.memoryMark === 'set') parts.memoryMark = 'missing';
}

/** The plane in the parser state; undefined where three print-outs do not show it. */
async function askPlane(parts: GcodeParts, signal?: AbortSignal): Promise<number | undefined> {
  for (let asked = 0; asked < planeQuestions; asked += 1) {
    const plane = planeIn(await askTwice(parts, '$G', signal));
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
  if (parts.memoryMark !== 'set') return;
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
  if (parts.memoryMark === 'set') demandMark(parts, planeIn(lines) ?? (await askPlane(parts, signal)));
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

/** Before a move: the mark is proven, or set again where it went missing. Throws POSITIONER_RESTARTED. */
export async function proveMemory(parts: GcodeParts, now: Placed, signal?: AbortSignal): Promise<void> {
  const restart = fallToZero(parts, now);
  if (restart) throw restart;
  if (parts.memoryMark === 'missing') await setModes(parts, signal);
  else await checkMemory(parts, signal);
}

/**
 * Without the mark a place that is zero, and was another when it was last trusted, is taken for a restart: the
 * reference is lost, and this is the error of it.
 */
export function fallToZero(parts: GcodeParts, now: Placed): DriverError | undefined {
  if (parts.memoryMark === 'set' || !parts.reference.hasFallenToZero(now)) return undefined;
  return restartedUnseen(parts, 'its position fell to zero');
}
