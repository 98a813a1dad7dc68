// What SQLite says when it fails, in the daemon's codes. A refused constraint is a defect of the caller;
// a disk that is full, locked or read-only is the world; a file that contradicts itself is damaged.
import Database from 'better-sqlite3';
import type { ErrorFacts } from '../../drivers/errors.ts';
import { DaemonError, type DaemonErrorCode } from '../errors.ts';

/** What was being done: the same failure means another thing to a reader than to a writer. */
export type Intent = 'open' | 'read' | 'write';

const remedies: Readonly<Record<string, string>> = {
  SQLITE_FULL: 'free space on the disk of the archive, then resume',
  SQLITE_READONLY: 'make the archive and its folder writable for the account of the daemon',
  SQLITE_PERM: 'make the archive and its folder writable for the account of the daemon',
  SQLITE_CANTOPEN: 'check that the path is a file and that its folder can be written',
  SQLITE_BUSY: 'close the other program that holds the archive',
  SQLITE_LOCKED: 'close the other program that holds the archive',
  SQLITE_IOERR: 'check the disk and the system log before anything else is measured',
  SQLITE_NOTADB: 'name another file as the archive; this one is left as it is',
  SQLITE_CORRUPT: 'keep the file, restore the last backup beside it',
};

/** `SQLITE_IOERR_FSYNC` → `SQLITE_IOERR`. */
function family(code: string): string {
  return code.split('_').slice(0, 2).join('_');
}

function codeFor(intent: Intent, kind: string): DaemonErrorCode {
  if (kind === 'SQLITE_CONSTRAINT' || kind === 'SQLITE_MISMATCH') return 'DEFECT';
  if (kind === 'SQLITE_CORRUPT') return 'ARCHIVE_DAMAGED';
  if (kind === 'SQLITE_NOTADB') return intent === 'open' ? 'ARCHIVE_UNUSABLE' : 'ARCHIVE_DAMAGED';
  return intent === 'write' ? 'ARCHIVE_WRITE_FAILED' : 'ARCHIVE_UNUSABLE';
}

/** Any error met while `what` was done, as a DaemonError with the first one as its cause. */
export function archiveError(intent: Intent, what: string, error: unknown, facts: ErrorFacts): DaemonError {
  if (error instanceof DaemonError) return error;
  const said = error instanceof Error ? error.message : String(error);
  if (!(error instanceof Database.SqliteError)) {
    // JSON was checked when it was written; what no longer parses has been altered since.
    const damaged = intent === 'read' && error instanceof SyntaxError;
    return new DaemonError(damaged ? 'ARCHIVE_DAMAGED' : 'DEFECT', `${what}: ${said}`, facts, error);
  }
  const kind = family(error.code);
  const remedy = remedies[kind];
  return new DaemonError(
    codeFor(intent, kind),
    `${what}: ${said}`,
    { ...facts, sqlite: error.code, ...(remedy === undefined ? {} : { remedy }) },
    error,
  );
}
