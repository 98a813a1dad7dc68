import Database from 'better-sqlite3';
import { describe, expect, it } from 'vitest';
import {
  archiveVersion,
  type Migration,
  migrate,
  migrations,
} from '../../../../daemon/archive/migrations.ts';
import { applicationId } from '../../../../daemon/archive/schema.ts';
import { failure } from './records.ts';

const first: Migration = { version: 1, what: 'one', sql: 'CREATE TABLE a (x INTEGER) STRICT' };
const second: Migration = { version: 2, what: 'two', sql: 'INSERT INTO a VALUES (7)' };

describe('migrations', () => {
  it('are numbered from 1 without gaps', () => {
    expect(migrations.map(({ version }) => version)).toEqual(migrations.map((_, i) => i + 1));
  });

  it('take an empty file to the newest version and mark it as ours', () => {
    const database = new Database(':memory:');
    migrate(database);
    expect(archiveVersion(database)).toBe(migrations.length);
    expect(database.pragma('application_id', { simple: true })).toBe(applicationId);
    expect(database.pragma('foreign_keys', { simple: true })).toBe(1);
  });

  it('make tables that all refuse a value of another type', () => {
    const database = new Database(':memory:');
    migrate(database);
    const tables = database.pragma('table_list') as { name: string; strict: number; type: string }[];
    const ours = tables.filter(({ name }) => !name.startsWith('sqlite_'));
    expect(ours.map(({ name }) => name).sort()).toEqual(['event', 'run', 'sample', 'segment', 'setup']);
    expect(ours.every(({ strict }) => strict === 1)).toBe(true);
  });

  it('take only the steps that are missing', () => {
    const database = new Database(':memory:');
    migrate(database, [first]);
    migrate(database, [first, second]);
    migrate(database, [first, second]);
    expect(database.prepare('SELECT x FROM a').pluck().all()).toEqual([7]);
    expect(archiveVersion(database)).toBe(2);
  });

  it('leave the archive at the last whole step when one fails', () => {
    const database = new Database(':memory:');
    migrate(database, [first]);
    const broken = { ...second, sql: `${second.sql}; INSERT INTO nowhere VALUES (1)` };
    expect(() => migrate(database, [first, broken])).toThrow('nowhere');
    expect(archiveVersion(database)).toBe(1);
    expect(database.prepare('SELECT count(*) FROM a').pluck().get()).toBe(0);
  });

  it('refuse a step that leaves rows without the row they point to', async () => {
    const database = new Database(':memory:');
    const sql = `CREATE TABLE up (id INTEGER PRIMARY KEY) STRICT;
      CREATE TABLE down (up INTEGER REFERENCES up (id)) STRICT; INSERT INTO down VALUES (3)`;
    const error = await failure('ARCHIVE_DAMAGED', () => migrate(database, [{ ...first, sql }]));
    expect(error.facts).toMatchObject({ version: 1, rows: 1 });
    expect(archiveVersion(database)).toBe(0);
  });

  it('refuse an archive with steps unknown here', async () => {
    const database = new Database(':memory:');
    migrate(database, [first, second]);
    const error = await failure('ARCHIVE_NEWER', () => migrate(database, [first]));
    expect(error.facts).toMatchObject({ found: 2, known: 1 });
  });
});
