// What passes between an archive on a worker thread and the thread that uses it: requests with a number,
// answers with the same number, and errors in a form that survives the passage (a class does not).
import type { ErrorFacts } from '../../drivers/errors.ts';
import { DaemonError, type DaemonErrorCode } from '../errors.ts';
import type { SqliteStore } from './sqlite-store.ts';

/** The store's calls that may be asked for; `close` is the last one. */
export type StoreCall = Exclude<keyof SqliteStore, symbol>;
export type CallArguments<C extends StoreCall> = Parameters<SqliteStore[C]>;
export type CallResult<C extends StoreCall> = ReturnType<SqliteStore[C]>;

export interface ArchiveRequest<C extends StoreCall = StoreCall> {
  id: number;
  call: C;
  args: CallArguments<C>;
}

/** The answer numbered `openedId` comes unasked, once the file is open or could not be opened. */
export type ArchiveAnswer = { id: number; result: unknown } | { id: number; failure: Failure };

export const openedId = 0;

export interface Failure {
  code: DaemonErrorCode;
  message: string;
  facts: ErrorFacts;
  cause?: { name: string; message: string; stack?: string };
}

export function failureOf(error: unknown): Failure {
  const known =
    error instanceof DaemonError
      ? error
      : new DaemonError('DEFECT', `the archive's thread failed: ${String(error)}`, {}, error);
  const { code, message, facts, cause } = known;
  if (!(cause instanceof Error)) return { code, message, facts };
  const { name, stack } = cause;
  const kept = { name, message: cause.message, ...(stack === undefined ? {} : { stack }) };
  return { code, message, facts, cause: kept };
}

export function errorOf({ code, message, facts, cause }: Failure): DaemonError {
  const original = cause === undefined ? undefined : Object.assign(new Error(cause.message), cause);
  return new DaemonError(code, message, facts, original);
}
