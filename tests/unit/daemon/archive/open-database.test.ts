import { existsSync, mkdirSync, readdirSync, readFileSync, renameSync, writeFileSync } from 'node:fs';
import { dirname } from 'node:path';
import Database from 'better-sqlite3';
import { describe, expect, it, onTestFinished } from 'vitest';
import { InThreadArchive } from '../../../../daemon/archive/in-thread-archive.ts';
import { openArchive } from '../../../../daemon/archive/open-archive.ts';
import { openDatabase } from '../../../../daemon/archive/open-database.ts';
import { applicationId } from '../../../../daemon/archive/schema.ts';
import { freshPath } from './fresh-path.ts';
import { failure, newRun, sample, startRun } from './records.ts';

describe('open an archive', () => {
  it('makes one where there is none, and where there is an empty file', () => {
    const path = freshPath();
    openDatabase(path).close();
    expect(existsSync(path)).toBe(true);
    const empty = freshPath();
    writeFileSync(empty, '');
    openDatabase(empty).close();
    // sqlite.org/fileformat2: the application id stands big-endian at offset 68.
    expect(readFileSync(empty).readInt32BE(68)).toBe(applicationId);
  });

  it('waits for the disk at every commit and checks foreign keys', () => {
    const database = openDatabase(freshPath());
    onTestFinished(() => void database.close());
    const pragma = (name: string) => database.pragma(name, { simple: true });
    // sqlite.org/pragma: synchronous 2 is FULL.
    expect([pragma('journal_mode'), pragma('synchronous'), pragma('foreign_keys')]).toEqual(['wal', 2, 1]);
    expect(pragma('recursive_triggers')).toBe(1);
  });

  it('keeps what was written, over closing and opening', async () => {
    const path = freshPath();
    const first = InThreadArchive.open(path);
    const run = await startRun(first);
    await first.addSample(run, sample(1));
    await first.close();
    const second = InThreadArchive.open(path);
    expect(await second.samples(run)).toEqual([sample(1)]);
    expect((await second.createRun(newRun)).number).toBe(2);
    await second.close();
  });

  it('leaves one file alone in its folder after closing', async () => {
    const path = freshPath('runs.archive');
    const archive = InThreadArchive.open(path);
    await startRun(archive);
    expect(readdirSync(dirname(path))).toContain('runs.archive-wal');
    await archive.close();
    expect(readdirSync(dirname(path))).toEqual(['runs.archive']);
  });

  it('says which folder is missing', async () => {
    const path = `${freshPath()}/below/runs.archive`;
    const error = await failure('ARCHIVE_UNUSABLE', () => openDatabase(path));
    expect(error.message).toContain(`there is no folder ${dirname(path)}`);
    expect(error.facts).toMatchObject({ path, remedy: expect.stringContaining('make the folder') });
    const onWorker = await failure('ARCHIVE_UNUSABLE', () => openArchive(path));
    expect(onWorker.message).toBe(error.message);
    expect(onWorker.facts).toEqual(error.facts);
  });

  it('refuses an empty path and a folder', async () => {
    await failure('ARCHIVE_UNUSABLE', () => openDatabase(''));
    const path = freshPath();
    mkdirSync(path);
    await failure('ARCHIVE_UNUSABLE', () => openDatabase(path));
  });

  it.each([
    ['a text', Buffer.from('not a database')],
    ['a long text', Buffer.alloc(5000, 'a line of text\n')],
  ])('refuses %s and leaves it as it is', async (_what, content) => {
    const path = freshPath();
    writeFileSync(path, content);
    const error = await failure('ARCHIVE_UNUSABLE', () => openDatabase(path));
    expect(error.facts).toMatchObject({ sqlite: 'SQLITE_NOTADB', remedy: expect.any(String) });
    expect(error.cause).toBeInstanceOf(Database.SqliteError);
    expect(readFileSync(path)).toEqual(content);
  });

  it.each([
    ['tables', 'CREATE TABLE theirs (x)'],
    ['a version', 'PRAGMA user_version = 1'],
    ['a mark of its own', 'PRAGMA application_id = 77'],
  ])("refuses another program's database with %s and leaves it as it is", async (_what, sql) => {
    const path = freshPath();
    new Database(path).exec(sql).close();
    const before = readFileSync(path);
    const error = await failure('ARCHIVE_UNUSABLE', () => openDatabase(path));
    expect(error.message).toContain('another program');
    expect(readFileSync(path)).toEqual(before);
    expect(readdirSync(dirname(path))).toHaveLength(1);
  });

  it('refuses an archive of a newer version and leaves it at that', async () => {
    const path = freshPath();
    const database = openDatabase(path);
    database.pragma('user_version = 1000');
    database.close();
    const error = await failure('ARCHIVE_NEWER', () => openDatabase(path));
    expect(error.facts).toMatchObject({ found: 1000, known: 1, path });
    await failure('ARCHIVE_NEWER', () => openArchive(path));
    const again = new Database(path);
    expect(again.pragma('user_version', { simple: true })).toBe(1000);
    again.close();
  });

  it('does not let a write-ahead log be deleted whose archive has gone', async () => {
    const path = freshPath();
    const archive = InThreadArchive.open(path);
    const run = await startRun(archive);
    await archive.addSample(run, sample(1));
    renameSync(path, `${path}.away`);
    const log = readFileSync(`${path}-wal`);
    const error = await failure('ARCHIVE_UNUSABLE', () => openDatabase(path));
    expect(error.facts).toMatchObject({ remedy: expect.stringContaining('put the archive back') });
    expect(readFileSync(`${path}-wal`)).toEqual(log);
    renameSync(`${path}.away`, path);
    expect(await archive.samples(run)).toEqual([sample(1)]);
    await archive.close();
  });

  it('says that another program holds the file', async () => {
    const path = freshPath();
    openDatabase(path).close();
    const holder = new Database(path);
    onTestFinished(() => void holder.close());
    holder.pragma('locking_mode = EXCLUSIVE');
    holder.exec('BEGIN EXCLUSIVE');
    const error = await failure('ARCHIVE_UNUSABLE', () => openDatabase(path, { busyTimeoutMs: 1 }));
    expect(error.facts).toMatchObject({ remedy: expect.stringContaining('other program') });
  });
});
