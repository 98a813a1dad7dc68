// The numbered steps from an empty file to the archive of today. PRAGMA user_version holds the number of
// the last step taken; each step is one transaction, so that a process that dies in between leaves the
// archive at a whole step. A step once released is never edited: a change is a new step at the end.
import type { Database } from 'better-sqlite3';
import { DaemonError } from '../errors.ts';
import { applicationId, schemaV1 } from './schema.ts';

export interface Migration {
  /** 1, 2 … without gaps. */
  version: number;
  what: string;
  sql: string;
}

export const migrations: readonly Migration[] = [
  { version: 1, what: 'runs, segments, setups, samples, events', sql: schemaV1 },
];

export function archiveVersion(database: Database): number {
  return database.pragma('user_version', { simple: true }) as number;
}

/**
 * Takes the steps that are missing. The file must already be known to be ours or empty. Throws
 * ARCHIVE_NEWER, before anything is written, when a later program has taken steps unknown here.
 */
export function migrate(database: Database, steps: readonly Migration[] = migrations): void {
  const known = steps.length;
  const found = archiveVersion(database);
  if (found > known) {
    throw new DaemonError(
      'ARCHIVE_NEWER',
      `the archive has version ${found}, this program knows versions up to ${known}`,
      { path: database.name, found, known, remedy: 'use the program that wrote it, or a later one' },
    );
  }
  // A step may rebuild a table that others point to; foreign keys are checked at its end instead.
  database.pragma('foreign_keys = OFF');
  for (const step of steps) if (step.version > found) take(database, step);
  database.pragma('foreign_keys = ON');
}

function take(database: Database, step: Migration): void {
  const act = database.transaction(() => {
    // Another process may have taken the step while this one waited for the lock.
    if (archiveVersion(database) >= step.version) return;
    database.exec(step.sql);
    database.pragma(`application_id = ${applicationId}`);
    database.pragma(`user_version = ${step.version}`);
    const broken = database.pragma('foreign_key_check') as unknown[];
    if (broken.length > 0) {
      throw new DaemonError('ARCHIVE_DAMAGED', `rows without the row they point to: ${step.what}`, {
        path: database.name,
        version: step.version,
        rows: broken.length,
      });
    }
  });
  act.immediate();
}
