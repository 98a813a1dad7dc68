// What can go wrong in the daemon, as values with a code, and for every code (the drivers' too) what it
// means and the operator's next step. The table is typed over all codes: one without advice does not compile.
import type { DriverErrorCode, ErrorFacts } from '../drivers/errors.ts';

export const daemonErrorCodes = [
  'USAGE_WRONG',
  'FILE_UNREADABLE',
  'FILE_INVALID',
  'PLAN_OUTSIDE_TRAVEL',
  'PLAN_AXIS_UNKNOWN',
  'REFERENCE_MISSING',
  'REFERENCE_DOES_NOT_FIT',
  'REFERENCE_TABLE_TOO_SHORT',
  'ARCHIVE_UNUSABLE',
  'ARCHIVE_NEWER',
  'ARCHIVE_NO_SUCH_RUN',
  'ARCHIVE_DAMAGED',
  'ARCHIVE_WRITE_FAILED',
  'PATTERN_BAD_INPUT',
  'RUN_INTERRUPTED',
  'RUN_TIES_TOO_FAR_APART',
  'DEFECT',
] as const;

export type DaemonErrorCode = (typeof daemonErrorCodes)[number];
export type ErrorCode = DriverErrorCode | DaemonErrorCode;

export class DaemonError extends Error {
  override readonly name = 'DaemonError';
  readonly code: DaemonErrorCode;
  readonly facts: ErrorFacts;

  constructor(code: DaemonErrorCode, message: string, facts: ErrorFacts = {}, cause?: unknown) {
    super(message, cause === undefined ? undefined : { cause });
    this.code = code;
    this.facts = facts;
  }
}
