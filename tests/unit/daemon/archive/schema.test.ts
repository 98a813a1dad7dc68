// What the tables refuse by themselves, whoever writes: raw SQL, past the store.
import type { Database } from 'better-sqlite3';
import { beforeEach, describe, expect, it } from 'vitest';
import { InThreadArchive } from '../../../../daemon/archive/in-thread-archive.ts';
import { openDatabase } from '../../../../daemon/archive/open-database.ts';
import { SqliteStore } from '../../../../daemon/archive/sqlite-store.ts';
import { event, sample, startRun } from './records.ts';

let database: Database;
let archive: InThreadArchive;

beforeEach(async () => {
  database = openDatabase(':memory:');
  archive = new InThreadArchive(new SqliteStore(database));
  const run = await startRun(archive);
  await archive.addSample(run, sample(1));
  await archive.addEvent(run, event);
});

describe('written once', () => {
  const tables = ['sample', 'segment', 'setup', 'event'];
  it.each(tables)('%s rows are not updated', (table) => {
    expect(() => database.exec(`UPDATE ${table} SET run = run`)).toThrow(`${table}s are never altered`);
  });

  it.each(tables)('%s rows are not deleted', (table) => {
    expect(() => database.exec(`DELETE FROM ${table}`)).toThrow(`${table}s are never altered`);
  });

  it.each(tables)('%s rows are not replaced, not even where replacing hides a delete', (table) => {
    database.pragma('recursive_triggers = OFF');
    const copy = `INSERT OR REPLACE INTO ${table} SELECT * FROM ${table}`;
    expect(() => database.exec(copy)).toThrow(`${table}s are never altered`);
  });

  it.each(['uuid', 'kind', 'started_wall_ms', 'plan_text', 'range_json', 'gain_reference_json'])(
    'the %s of a run is not altered',
    (column) => {
      expect(() => database.exec(`UPDATE run SET ${column} = ${column}`)).toThrow('never altered');
    },
  );

  it('a run with samples is not deleted', () => {
    expect(() => database.exec('DELETE FROM run')).toThrow('FOREIGN KEY');
  });

  it.each(['complete', 'failed'])('a %s run stays so and takes no samples', (state) => {
    database.exec(`UPDATE run SET state = '${state}', ended_wall_ms = 1`);
    expect(() => database.exec("UPDATE run SET state = 'running', ended_wall_ms = NULL")).toThrow('stays so');
    const copy = database.prepare('SELECT * FROM sample').get() as Record<string, unknown>;
    const names = Object.keys(copy);
    const values = { ...copy, sequence: 2 };
    const sql = `INSERT INTO sample (${names}) VALUES (${names.map((name) => `:${name}`)})`;
    expect(() => database.prepare(sql).run(values)).toThrow('takes no samples');
  });
});

describe('checks', () => {
  function insertSample(change: Record<string, unknown>): void {
    const row = { ...(database.prepare('SELECT * FROM sample').get() as object), sequence: 2, ...change };
    const names = Object.keys(row);
    database.prepare(`INSERT INTO sample (${names}) VALUES (${names.map((name) => `:${name}`)})`).run(row);
  }

  it('let a right row pass', () => {
    insertSample({});
    expect(database.prepare('SELECT count(*) FROM sample').pluck().get()).toBe(2);
  });

  it.each<[string, unknown]>([
    ['sequence', 0],
    ['segment', 2],
    ['setup', 2],
    ['points', 4],
    ['run', 9],
    ['purpose', 'else'],
    ['component', 'both'],
    ['attempt', 0],
    ['attempt', 1.5],
    ['angle_deg', null],
    ['angle_deg', 'north'],
    ['stop_monotonic_ms', -1],
    ['law_kind', 'stepped'],
    ['law_last_ms', 0],
    ['target_json', '{'],
    ['track_json', ''],
    ['traces', 'text'],
    ['traces', null],
  ])('refuse a sample with %s %s', (column, value) => {
    expect(() => insertSample({ [column]: value })).toThrow(/constraint|cannot store/);
  });

  it('keep state and end of a run together', () => {
    expect(() => database.exec("UPDATE run SET state = 'complete'")).toThrow('CHECK');
    expect(() => database.exec('UPDATE run SET ended_wall_ms = 1')).toThrow('CHECK');
    expect(() => database.exec("UPDATE run SET reason = 'wind'")).toThrow('CHECK');
    expect(() => database.exec("UPDATE run SET state = 'done', ended_wall_ms = 1")).toThrow('CHECK');
  });

  it('never give a number twice, even when the newest run is gone', async () => {
    const { number } = await archive.createRun({ ...(await archive.run(1)) });
    database.exec(`DELETE FROM run WHERE number = ${number}`);
    expect((await archive.createRun({ ...(await archive.run(1)) })).number).toBe(number + 1);
  });
});
