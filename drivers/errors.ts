// What can go wrong with hardware, as a value with a code. The operator's wording lives in the daemon's
// advice table (daemon/errors.ts), which is typed over these codes: a code without advice does not compile.

export const driverErrorCodes = [
  'LINK_OPEN_FAILED',
  'LINK_CLOSED',
  'LINK_TIMEOUT',
  'ANALYZER_NOT_ANSWERING',
  'ANALYZER_IDENTITY_CHANGED',
  'ANALYZER_COMMAND_REFUSED',
  'ANALYZER_SETTING_DIFFERS',
  'ANALYZER_BAD_ANSWER',
  'ANALYZER_BAD_BLOCK',
  'ANALYZER_IMPLAUSIBLE_DATA',
  'ANALYZER_SWEEP_TIMEOUT',
  'ANALYZER_DEVICE_ERROR',
  'ANALYZER_POWER_CYCLED',
  'ANALYZER_OUT_OF_STEP',
  'ANALYZER_INTERRUPTED',
  'ANALYZER_BAD_DIALECT',
  'POSITIONER_NOT_ANSWERING',
  'POSITIONER_UNEXPECTED_CONTROLLER',
  'POSITIONER_UNSAFE_SETTING',
  'POSITIONER_BUSY_AT_CONNECT',
  'POSITIONER_COMMAND_REFUSED',
  'POSITIONER_BAD_ANSWER',
  'POSITIONER_ALARM',
  'POSITIONER_RESTARTED',
  'POSITIONER_REFERENCE_LOST',
  'POSITIONER_HELD',
  'POSITIONER_STALLED',
  'POSITIONER_WRONG_PLACE',
  'POSITIONER_OUTSIDE_TRAVEL',
  'POSITIONER_STOPPED',
  'POSITIONER_STOP_UNCONFIRMED',
] as const;

export type DriverErrorCode = (typeof driverErrorCodes)[number];

/** Facts of one failure: numbers and short texts that the operator and the log need. */
export type ErrorFacts = Readonly<Record<string, string | number | boolean>>;

export class DriverError extends Error {
  override readonly name = 'DriverError';
  readonly code: DriverErrorCode;
  readonly facts: ErrorFacts;

  /** `message` says what happened in one line; `facts` carries the values; always pass the `cause`. */
  constructor(code: DriverErrorCode, message: string, facts: ErrorFacts = {}, cause?: unknown) {
    super(message, cause === undefined ? undefined : { cause });
    this.code = code;
    this.facts = facts;
  }
}

export function isDriverError(error: unknown, ...codes: DriverErrorCode[]): error is DriverError {
  return error instanceof DriverError && (codes.length === 0 || codes.includes(error.code));
}
