// What the run does by itself after each failure of a device. Typed over all driver codes, so that a new
// code without a decision does not compile.
//   again    the same position once more, from the approach side if an axis was involved
//   reopen   the device's session is opened anew and proven, a new segment begins with a tie
//   rehome   like reopen, and the axes are homed before an angle is trusted again
//   give-up  a person has to look; motors still, source off, the run ends
import type { DriverErrorCode } from '../../drivers/errors.ts';
import type { Device } from './events.ts';

export type Reaction = 'again' | 'reopen' | 'rehome' | 'give-up';

/** For one position: tries of all kinds together, spread over five minutes. What lasts longer is no burst. */
export const triesPerPosition = 10;
/** Reopened or rehomed segments in one run. */
export const segmentsPerRun = 40;
/** How long a device may stay away; analyzers need up to three minutes to boot. */
export const patienceMs: Readonly<Record<Device, number>> = { analyzer: 300_000, positioner: 60_000 };

const reactions: Readonly<Record<DriverErrorCode, Reaction>> = {
  LINK_OPEN_FAILED: 'reopen',
  LINK_CLOSED: 'reopen',
  LINK_TIMEOUT: 'reopen',
  ANALYZER_NOT_ANSWERING: 'reopen',
  ANALYZER_IDENTITY_CHANGED: 'give-up',
  ANALYZER_COMMAND_REFUSED: 'give-up',
  ANALYZER_SETTING_DIFFERS: 'give-up',
  ANALYZER_BAD_ANSWER: 'again',
  ANALYZER_BAD_BLOCK: 'again',
  ANALYZER_IMPLAUSIBLE_DATA: 'again',
  ANALYZER_SWEEP_TIMEOUT: 'again',
  ANALYZER_DEVICE_ERROR: 'again',
  ANALYZER_POWER_CYCLED: 'reopen',
  ANALYZER_OUT_OF_STEP: 'reopen',
  ANALYZER_INTERRUPTED: 'give-up',
  ANALYZER_BAD_DIALECT: 'give-up',
  POSITIONER_NOT_ANSWERING: 'rehome',
  POSITIONER_UNEXPECTED_CONTROLLER: 'give-up',
  POSITIONER_UNSAFE_SETTING: 'give-up',
  POSITIONER_BUSY_AT_CONNECT: 'give-up',
  POSITIONER_COMMAND_REFUSED: 'again',
  POSITIONER_BAD_ANSWER: 'again',
  POSITIONER_ALARM: 'give-up',
  POSITIONER_RESTARTED: 'rehome',
  POSITIONER_REFERENCE_LOST: 'rehome',
  POSITIONER_HELD: 'give-up',
  POSITIONER_STALLED: 'give-up',
  POSITIONER_WRONG_PLACE: 'again',
  POSITIONER_OUTSIDE_TRAVEL: 'give-up',
  POSITIONER_STOPPED: 'give-up',
  POSITIONER_STOP_UNCONFIRMED: 'rehome',
};

/** A lost link to the controller costs the reference; one to the analyzer does not. */
export function reactionTo(code: DriverErrorCode, device: Device): Reaction {
  const reaction = reactions[code];
  return device === 'positioner' && reaction === 'reopen' ? 'rehome' : reaction;
}

/** Wait before the n-th retry (1, 2, …): a burst of interference or a tripped switch gets time to pass. */
export function waitBeforeRetryMs(retry: number): number {
  const waitsMs = [200, 1_000, 3_000, 10_000, 30_000, 60_000];
  return waitsMs[Math.min(retry, waitsMs.length) - 1] ?? 60_000;
}
