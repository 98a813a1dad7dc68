// What the standard event register (IEEE 488.2) and the error queue (SCPI-1999) say, and which kind of
// trouble an entry is. Pure: who asks and what is done about it is elsewhere.
import { DriverError, type DriverErrorCode } from '../errors.ts';
import type { ScpiErrorEntry } from './scpi-values.ts';

/** Bits of `*ESR?`; reading clears them all. */
export const eventBits = {
  operationComplete: 1,
  queryError: 4,
  deviceError: 8,
  executionError: 16,
  commandError: 32,
  powerOn: 128,
} as const;

/** Any of these and the error queue holds an entry. */
export const anyErrorBits =
  eventBits.queryError | eventBits.deviceError | eventBits.executionError | eventBits.commandError;

/** What an instrument says to a command or query that it does not have. */
export const undefinedHeader = -113;
export const initIgnored = -213;
export const dataStale = -230;
const queueOverflow = -350;

/** The two refusals of a sweep that one repair cures: stop and try again, or sweep once more. */
export function isCurable(error: unknown): error is DriverError {
  if (!(error instanceof DriverError)) return false;
  const code = error.facts['scpiCode'];
  return code === initIgnored || code === dataStale;
}

/** Entries that are news rather than errors: user request, request for control, operation complete. */
function isMereEvent(code: number): boolean {
  return code <= -600 && code > -900;
}

function driverCodeOf(code: number): DriverErrorCode {
  if (code === initIgnored || code === dataStale) return 'ANALYZER_DEVICE_ERROR';
  if (code === -240 || code === -241 || code > 0) return 'ANALYZER_DEVICE_ERROR';
  if (code <= -100 && code > -300) return 'ANALYZER_COMMAND_REFUSED';
  if (code <= -400 && code > -500) return 'ANALYZER_OUT_OF_STEP';
  if (code <= -500 && code > -600) return 'ANALYZER_POWER_CYCLED';
  return 'ANALYZER_DEVICE_ERROR';
}

/** The entry that says most: the oldest, but a loss of older entries or mere news only if nothing else. */
function worstOf(entries: readonly ScpiErrorEntry[]): ScpiErrorEntry | undefined {
  const errors = entries.filter(({ code }) => code !== 0 && !isMereEvent(code));
  return errors.find(({ code }) => code !== queueOverflow) ?? errors[0];
}

/** The entries on one line, for messages. */
export function listEntries(entries: readonly ScpiErrorEntry[]): string {
  const shown = entries.slice(0, 4).map(({ code, text }) => `${code} ${text}`);
  if (entries.length > shown.length) shown.push(`and ${entries.length - shown.length} more`);
  return shown.join('; ');
}

/**
 * Drained entries as the error they amount to, `undefined` when there is none. `during` says what was
 * being done ("the sweep", "': FREQ:STAR 1e9'"). Facts: `scpiCode` and `scpiText` of the telling entry,
 * `entries` their number, `entriesLost` when the queue had overflowed.
 */
export function errorOf(
  entries: readonly ScpiErrorEntry[],
  during: string,
  cause?: unknown,
): DriverError | undefined {
  const worst = worstOf(entries);
  if (!worst) return undefined;
  const facts = {
    scpiCode: worst.code,
    scpiText: worst.text,
    entries: entries.length,
    entriesLost: entries.some(({ code }) => code === queueOverflow),
    during,
  };
  const message = `${during}: the instrument reports ${listEntries(entries)}`;
  return new DriverError(driverCodeOf(worst.code), message, facts, cause);
}

/** A query without answer was perhaps refused: then the error queue, read afterwards, has the reason. */
export function explainSilence(error: DriverError, entries: readonly ScpiErrorEntry[]): DriverError {
  if (error.code !== 'ANALYZER_NOT_ANSWERING') return error;
  return errorOf(entries, `'${error.facts['message'] ?? 'a question'}' got no answer`, error) ?? error;
}

/** An operation failed, and so did bringing the session back into step: what the caller must know. */
export function stillOutOfStep(first: DriverError, second: unknown): unknown {
  if (second instanceof DriverError) {
    if (second.code === 'ANALYZER_IDENTITY_CHANGED' || second.code === 'ANALYZER_POWER_CYCLED') return second;
  }
  const because = second instanceof Error ? second.message : String(second);
  return new DriverError(
    first.code,
    `${first.message}; the session is still out of step: ${because}`,
    { ...first.facts, inStep: false },
    first,
  );
}
