// How the store fails when the world does: disk full, read-only, locked, damaged.
import { readFileSync, writeFileSync } from 'node:fs';
import Database from 'better-sqlite3';
import { describe, expect, it, onTestFinished } from 'vitest';
import { InThreadArchive } from '../../../../daemon/archive/in-thread-archive.ts';
import { openDatabase } from '../../../../daemon/archive/open-database.ts';
import { SqliteStore } from '../../../../daemon/archive/sqlite-store.ts';
import { freshPath } from './fresh-path.ts';
import { failure, newRun, sample, startRun } from './records.ts';

function opened(path: string): { archive: InThreadArchive; database: Database.Database } {
  const database = openDatabase(path, { busyTimeoutMs: 1 });
  onTestFinished(() => void database.close());
  return { archive: new InThreadArchive(new SqliteStore(database)), database };
}

describe('store', () => {
  it('says that the disk is full, keeps what was announced, and goes on when there is space', async () => {
    const { archive, database } = opened(freshPath());
    const run = await startRun(archive);
    const pages = database.pragma('page_count', { simple: true }) as number;
    database.pragma(`max_page_count = ${pages + 2}`);
    let announced = 0;
    const error = await failure('ARCHIVE_WRITE_FAILED', async () => {
      for (let sequence = 1; sequence < 1000; sequence += 1) {
        await archive.addSample(run, sample(sequence));
        announced = sequence;
      }
    });
    expect(error.facts).toMatchObject({ sqlite: 'SQLITE_FULL', run, sequence: announced + 1 });
    expect(error.facts['remedy']).toContain('free space');
    expect(error.cause).toBeInstanceOf(Database.SqliteError);
    expect(announced).toBeGreaterThan(0);
    expect(await archive.samples(run)).toHaveLength(announced);
    database.pragma('max_page_count = 100000');
    await archive.addSample(run, sample(announced + 1));
    expect(await archive.samples(run)).toHaveLength(announced + 1);
  });

  it('says that another program is writing, and goes on when it has finished', async () => {
    const path = freshPath();
    const { archive } = opened(path);
    const run = await startRun(archive);
    const other = new Database(path);
    onTestFinished(() => void other.close());
    other.exec('BEGIN IMMEDIATE');
    const error = await failure('ARCHIVE_WRITE_FAILED', () => archive.addSample(run, sample(1)));
    expect(error.facts).toMatchObject({ sqlite: 'SQLITE_BUSY', remedy: expect.any(String) });
    expect(await archive.samples(run)).toEqual([]);
    other.exec('ROLLBACK');
    await archive.addSample(run, sample(1));
  });

  it('says that the file cannot be written, and still reads it', async () => {
    const path = freshPath();
    const { archive } = opened(path);
    const run = await startRun(archive);
    await archive.addSample(run, sample(1));
    const reader = new InThreadArchive(new SqliteStore(new Database(path, { readonly: true })));
    const error = await failure('ARCHIVE_WRITE_FAILED', () => reader.addSample(run, sample(2)));
    expect(error.facts).toMatchObject({
      sqlite: 'SQLITE_READONLY',
      remedy: expect.stringContaining('writable'),
    });
    expect(await reader.samples(run)).toEqual([sample(1)]);
    await reader.close();
  });

  it('names run and sequence of a damaged sample; the others can still be read', async () => {
    const { archive, database } = opened(freshPath());
    const run = await startRun(archive);
    await archive.addSample(run, sample(1, { purpose: 'tie' }));
    await archive.addSample(run, sample(2));
    // As a bad disk would: past the trigger.
    database.exec('DROP TRIGGER sample_not_updated');
    const blob = database.prepare('SELECT traces FROM sample WHERE sequence = 2').pluck().get() as Buffer;
    blob[40]! ^= 1;
    database.prepare('UPDATE sample SET traces = ? WHERE sequence = 2').run(blob);
    const error = await failure('ARCHIVE_DAMAGED', () => archive.samples(run));
    expect(error.facts).toMatchObject({ run, sequence: 2 });
    expect(await archive.samples(run, { purposes: ['tie'] })).toEqual([sample(1, { purpose: 'tie' })]);
    expect((await archive.runs())[0]!.samples).toBe(2);
  });

  it('says that the file contradicts itself', async () => {
    const path = freshPath();
    const first = opened(path);
    const run = await startRun(first.archive);
    await first.archive.addSample(run, sample(1));
    const root = first.database
      .prepare("SELECT rootpage FROM sqlite_schema WHERE name = 'sample'")
      .pluck()
      .get();
    const pageBytes = first.database.pragma('page_size', { simple: true }) as number;
    await first.archive.close();
    const bytes = readFileSync(path);
    bytes.fill(0xff, ((root as number) - 1) * pageBytes, (root as number) * pageBytes);
    writeFileSync(path, bytes);
    const { archive } = opened(path);
    const error = await failure('ARCHIVE_DAMAGED', () => archive.samples(run));
    expect(error.facts['sqlite']).toContain('SQLITE_CORRUPT');
    await failure('ARCHIVE_DAMAGED', () => archive.addSample(run, sample(2)));
    expect(await archive.run(run)).toMatchObject(newRun);
  });

  it('changes nothing when a write of two rows fails at the second', async () => {
    const { archive } = opened(freshPath());
    const run = await startRun(archive);
    await archive.endRun(run, 'interrupted', 5, 'wind');
    // The segment is there already: the run must not be left running.
    await failure('DEFECT', async () => archive.addSegment(run, (await archive.segments(run))[0]!));
    expect(await archive.run(run)).toMatchObject({ state: 'interrupted', endedWallMs: 5, reason: 'wind' });
  });

  it('closes on a full disk too, and loses nothing', async () => {
    const path = freshPath();
    const { archive, database } = opened(path);
    const run = await startRun(archive);
    await archive.addSample(run, sample(1));
    let asked = '';
    database.pragma = (source) => {
      asked = source;
      throw new Database.SqliteError('database or disk is full', 'SQLITE_FULL');
    };
    await archive.close();
    expect(asked).toContain('wal_checkpoint');
    expect(database.open).toBe(false);
    const again = opened(path).archive;
    expect(await again.samples(run)).toEqual([sample(1)]);
  });
});
