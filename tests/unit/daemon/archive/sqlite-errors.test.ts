import Database from 'better-sqlite3';
import { describe, expect, it } from 'vitest';
import { archiveError, type Intent } from '../../../../daemon/archive/sqlite-errors.ts';
import { DaemonError, type DaemonErrorCode } from '../../../../daemon/errors.ts';

describe('what SQLite says', () => {
  // Result codes and their meaning: sqlite.org/rescode.
  it.each<[string, Intent, DaemonErrorCode]>([
    ['SQLITE_FULL', 'write', 'ARCHIVE_WRITE_FAILED'],
    ['SQLITE_FULL', 'open', 'ARCHIVE_UNUSABLE'],
    ['SQLITE_IOERR_FSYNC', 'write', 'ARCHIVE_WRITE_FAILED'],
    ['SQLITE_IOERR_READ', 'read', 'ARCHIVE_UNUSABLE'],
    ['SQLITE_READONLY_DBMOVED', 'write', 'ARCHIVE_WRITE_FAILED'],
    ['SQLITE_BUSY_SNAPSHOT', 'write', 'ARCHIVE_WRITE_FAILED'],
    ['SQLITE_BUSY', 'open', 'ARCHIVE_UNUSABLE'],
    ['SQLITE_CANTOPEN', 'open', 'ARCHIVE_UNUSABLE'],
    ['SQLITE_NOTADB', 'open', 'ARCHIVE_UNUSABLE'],
    ['SQLITE_NOTADB', 'read', 'ARCHIVE_DAMAGED'],
    ['SQLITE_CORRUPT_INDEX', 'read', 'ARCHIVE_DAMAGED'],
    ['SQLITE_CORRUPT', 'write', 'ARCHIVE_DAMAGED'],
    ['SQLITE_CONSTRAINT_TRIGGER', 'write', 'DEFECT'],
  ])('%s on %s is %s', (sqlite, intent, code) => {
    const cause = new Database.SqliteError('said', sqlite);
    const error = archiveError(intent, 'cannot do it', cause, { run: 3 });
    expect(error.code).toBe(code);
    expect(error.message).toBe('cannot do it: said');
    expect(error.facts).toMatchObject({ run: 3, sqlite });
    expect(error.cause).toBe(cause);
    expect('remedy' in error.facts).toBe(code !== 'DEFECT');
  });

  it('leaves an error of ours as it is', () => {
    const ours = new DaemonError('ARCHIVE_NEWER', 'newer');
    expect(archiveError('read', 'cannot', ours, {})).toBe(ours);
  });

  it('takes text that no longer parses for damage on reading, anything else for a defect', () => {
    expect(archiveError('read', 'cannot', new SyntaxError('JSON'), {}).code).toBe('ARCHIVE_DAMAGED');
    expect(archiveError('write', 'cannot', new SyntaxError('JSON'), {}).code).toBe('DEFECT');
    expect(archiveError('read', 'cannot', new TypeError('undefined'), {}).code).toBe('DEFECT');
  });
});
