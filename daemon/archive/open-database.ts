// Opens the file of an archive, or makes it, and leaves it alone when it is not one. Nothing is written
// before the file is known to be ours or empty.
import { existsSync, statSync } from 'node:fs';
import { dirname } from 'node:path';
import Database from 'better-sqlite3';
import { DaemonError } from '../errors.ts';
import { migrate } from './migrations.ts';
import { applicationId } from './schema.ts';
import { archiveError } from './sqlite-errors.ts';

export interface DatabaseOptions {
  /** How long a write waits for another process to let go of the file. */
  busyTimeoutMs?: number;
}

/** Pages of write-ahead log after which they are copied into the file: about 4 MB, some 500 samples. */
const checkpointPages = 1000;
const defaultBusyTimeoutMs = 5000;

export const inMemory = ':memory:';

/**
 * `path` names a file or is `:memory:`. Throws ARCHIVE_UNUSABLE (no folder, not ours, not SQLite, locked),
 * ARCHIVE_NEWER, ARCHIVE_DAMAGED; then the file is as it was.
 */
export function openDatabase(path: string, options: DatabaseOptions = {}): Database.Database {
  if (path !== inMemory) checkPlace(path);
  let database: Database.Database | undefined;
  try {
    database = new Database(path, { timeout: options.busyTimeoutMs ?? defaultBusyTimeoutMs });
    checkOurs(database, path);
    configure(database, path);
    migrate(database);
    return database;
  } catch (error) {
    database?.close();
    throw archiveError('open', `cannot open the archive ${path}`, error, { path });
  }
}

function unusable(path: string, because: string, remedy: string): DaemonError {
  return new DaemonError('ARCHIVE_UNUSABLE', `cannot use ${path} as archive: ${because}`, { path, remedy });
}

function checkPlace(path: string): void {
  if (path === '') throw unusable(path, 'its path is empty', 'name a file as the archive');
  const folder = dirname(path);
  if (!existsSync(folder)) {
    throw unusable(path, `there is no folder ${folder}`, `make the folder ${folder}, or name another file`);
  }
  const size = existsSync(path) ? statSync(path).size : 0;
  const log = `${path}-wal`;
  // SQLite would delete the log of an empty file, and with it samples that were announced.
  if (size === 0 && existsSync(log) && statSync(log).size > 0) {
    const remedy = `put the archive back beside ${log}, or move ${log} away`;
    throw unusable(path, 'the archive is gone, its write-ahead log is still there', remedy);
  }
}

function checkOurs(database: Database.Database, path: string): void {
  const id = database.pragma('application_id', { simple: true });
  if (id === applicationId) return;
  const version = database.pragma('user_version', { simple: true });
  const objects = database.prepare('SELECT count(*) FROM sqlite_schema').pluck().get();
  if (id === 0 && version === 0 && objects === 0) return;
  throw unusable(path, 'it is the database of another program', 'name another file as the archive');
}

function configure(database: Database.Database, path: string): void {
  if (path !== inMemory) {
    const mode = database.pragma('journal_mode = WAL', { simple: true });
    if (mode !== 'wal') {
      throw unusable(path, `its disk allows no write-ahead log (mode ${mode})`, 'put it on a local disk');
    }
  }
  // FULL, said aloud: the library's own default for a write-ahead log does not wait for the disk.
  database.pragma('synchronous = FULL');
  database.pragma(`wal_autocheckpoint = ${checkpointPages}`);
  // INSERT OR REPLACE deletes; only with this do the triggers see it.
  database.pragma('recursive_triggers = ON');
  database.pragma('trusted_schema = OFF');
}
