// The archive's calls over one SQLite connection, synchronously: when a call returns, its transaction is
// committed. The SQL of the daemon is here and in schema.ts, nowhere else. Promises and threads are put
// around it by in-thread-archive.ts and worker-archive.ts.
import SqliteDatabase, { type Database, type Statement } from 'better-sqlite3';
import { DaemonError } from '../errors.ts';
import type {
  NewRun,
  RunEventRecord,
  RunRecord,
  RunRef,
  RunState,
  RunSummary,
  SampleFilter,
  SampleRecord,
  SegmentRecord,
  SetupRecord,
} from './archive.ts';
import { type DatabaseOptions, openDatabase } from './open-database.ts';
import {
  type EventRow,
  eventOfRow,
  type RunRow,
  rowOfEvent,
  rowOfRun,
  rowOfSample,
  rowOfSegment,
  rowOfSetup,
  runOfRow,
  type SampleRow,
  type SegmentRow,
  type SetupRow,
  type SummaryRow,
  sampleOfRow,
  segmentOfRow,
  setupOfRow,
  summaryOfRow,
} from './rows.ts';
import { archiveError, type Intent } from './sqlite-errors.ts';

const { SqliteError } = SqliteDatabase;

/** What is written into each table, a named parameter for every column. */
const columns = {
  run: `uuid kind antenna_name antenna_revision range_name started_wall_ms plan_text plan_json range_text
    range_json gain_reference_json`,
  segment: 'run segment reason epoch_wall_ms epoch_monotonic_ms analyzer_json controller_json',
  setup: 'run setup points sweep_json calibration_json',
  sample: `run sequence segment setup points purpose cut target_json axis angle_deg component attempt
    start_monotonic_ms stop_monotonic_ms law_kind law_first_ms law_last_ms track_json traces`,
  event: 'run segment wall_ms monotonic_ms kind text facts_json',
};

function insertInto(table: keyof typeof columns): string {
  const names = columns[table].split(/\s+/);
  return `INSERT INTO ${table} (${names.join(', ')}) VALUES (${names.map((name) => `:${name}`).join(', ')})`;
}

function prepareAll(database: Database) {
  const prepare = (sql: string): Statement => database.prepare(sql);
  return {
    insertRun: prepare(insertInto('run')),
    insertSegment: prepare(insertInto('segment')),
    insertSetup: prepare(insertInto('setup')),
    insertSample: prepare(insertInto('sample')),
    insertEvent: prepare(insertInto('event')),
    reopenRun: prepare(
      `UPDATE run SET state = 'running', ended_wall_ms = NULL, reason = NULL
       WHERE number = ? AND state = 'interrupted'`,
    ),
    endRun: prepare(
      'UPDATE run SET state = :state, ended_wall_ms = :endedWallMs, reason = :reason WHERE number = :run',
    ),
    runState: prepare('SELECT state FROM run WHERE number = ?').pluck(),
    run: prepare('SELECT * FROM run WHERE number = ?'),
    runs: prepare(
      `SELECT number, uuid, kind, state, antenna_name, antenna_revision, range_name, started_wall_ms,
         ended_wall_ms, (SELECT count(*) FROM sample WHERE sample.run = run.number) AS samples
       FROM run ORDER BY number DESC`,
    ),
    segments: prepare('SELECT * FROM segment WHERE run = ? ORDER BY segment'),
    setups: prepare('SELECT * FROM setup WHERE run = ? ORDER BY setup'),
    samples: prepare(
      `SELECT * FROM sample WHERE run = :run AND (:cut IS NULL OR cut = :cut)
         AND (:purposes IS NULL OR purpose IN (SELECT value FROM json_each(:purposes)))
       ORDER BY sequence`,
    ),
    events: prepare('SELECT * FROM event WHERE run = ? ORDER BY id'),
  };
}

export class SqliteStore {
  readonly #database: Database;
  readonly #sql: ReturnType<typeof prepareAll>;

  /** The database must have been opened by `openDatabase`; the store closes it. */
  constructor(database: Database) {
    this.#database = database;
    this.#sql = prepareAll(database);
  }

  /** Throws what `openDatabase` throws. */
  static open(path: string, options: DatabaseOptions = {}): SqliteStore {
    return new SqliteStore(openDatabase(path, options));
  }

  createRun(run: NewRun, uuid: string): RunRef {
    return this.#write('create the run', {}, () => {
      const { lastInsertRowid } = this.#sql.insertRun.run(rowOfRun(run, uuid));
      return { number: Number(lastInsertRowid), uuid };
    });
  }

  /** A segment added to an interrupted run sets it running again. */
  addSegment(run: number, segment: SegmentRecord): void {
    this.#write('add the segment', { run, segment: segment.segment }, () => {
      const state = this.#stateOf(run);
      if (state === 'complete' || state === 'failed') throw ended(run, state);
      this.#sql.reopenRun.run(run);
      this.#sql.insertSegment.run(rowOfSegment(run, segment));
    });
  }

  addSetup(run: number, setup: SetupRecord): void {
    this.#write('add the setup', { run, setup: setup.setup }, () => {
      this.#stateOf(run);
      this.#sql.insertSetup.run(rowOfSetup(run, setup));
    });
  }

  addSample(run: number, sample: SampleRecord): void {
    this.#write('add the sample', { run, sequence: sample.sequence }, () => {
      this.#stateOf(run);
      this.#sql.insertSample.run(rowOfSample(run, sample));
    });
  }

  addEvent(run: number, event: RunEventRecord): void {
    this.#write('add the event', { run, kind: event.kind }, () => {
      this.#stateOf(run);
      this.#sql.insertEvent.run(rowOfEvent(run, event));
    });
  }

  /** An interrupted run may still be given up (`failed`) or found complete; those two are final. */
  endRun(run: number, state: Exclude<RunState, 'running'>, endedWallMs: number, reason?: string): void {
    this.#write('end the run', { run, state }, () => {
      const before = this.#stateOf(run);
      if (before === 'complete' || before === 'failed') throw ended(run, before);
      this.#sql.endRun.run({ run, state, endedWallMs, reason: reason ?? null });
    });
  }

  runs(): RunSummary[] {
    return this.#read('list the runs', {}, () => (this.#sql.runs.all() as SummaryRow[]).map(summaryOfRow));
  }

  run(number: number): RunRecord {
    return this.#read('read the run', { run: number }, () => {
      this.#stateOf(number);
      return runOfRow(this.#sql.run.get(number) as RunRow);
    });
  }

  segments(run: number): SegmentRecord[] {
    return this.#read('read the segments', { run }, () => {
      this.#stateOf(run);
      return (this.#sql.segments.all(run) as SegmentRow[]).map(segmentOfRow);
    });
  }

  setups(run: number): SetupRecord[] {
    return this.#read('read the setups', { run }, () => {
      this.#stateOf(run);
      return (this.#sql.setups.all(run) as SetupRow[]).map(setupOfRow);
    });
  }

  samples(run: number, filter: SampleFilter = {}): SampleRecord[] {
    return this.#read('read the samples', { run }, () => {
      this.#stateOf(run);
      const purposes = filter.purposes === undefined ? null : JSON.stringify(filter.purposes);
      const rows = this.#sql.samples.iterate({ run, purposes, cut: filter.cut ?? null });
      // Row by row: a long run's blobs need not stand in memory twice.
      return Array.from(rows as Iterable<SampleRow>, sampleOfRow);
    });
  }

  events(run: number): RunEventRecord[] {
    return this.#read('read the events', { run }, () => {
      this.#stateOf(run);
      return (this.#sql.events.all(run) as EventRow[]).map(eventOfRow);
    });
  }

  /** Copies the write-ahead log into the file as far as disk and readers allow. Closing again does nothing. */
  close(): void {
    if (!this.#database.open) return;
    try {
      // Passive: it waits for nobody.
      if (!this.#database.memory && !this.#database.readonly)
        this.#database.pragma('wal_checkpoint(PASSIVE)');
    } catch (error) {
      // A full disk must not turn a finished run into a failed one: what stays in the log is as durable
      // as before, and the next one to open the archive copies it.
      if (!(error instanceof SqliteError)) throw this.#failure('write', 'close the archive', error, {});
    } finally {
      this.#database.close();
    }
  }

  #stateOf(run: number): RunState {
    const state = this.#sql.runState.get(run) as RunState | undefined;
    if (state !== undefined) return state;
    const facts = { run, path: this.#database.name };
    throw new DaemonError('ARCHIVE_NO_SUCH_RUN', `there is no run ${run} in ${this.#database.name}`, facts);
  }

  #write<T>(what: string, facts: Facts, act: () => T): T {
    this.#demandOpen(what);
    try {
      return this.#database.transaction(act).immediate();
    } catch (error) {
      throw this.#failure('write', what, error, facts);
    }
  }

  /** One transaction, so that what is read is of one moment even while another process writes. */
  #read<T>(what: string, facts: Facts, act: () => T): T {
    this.#demandOpen(what);
    try {
      return this.#database.transaction(act).deferred();
    } catch (error) {
      throw this.#failure('read', what, error, facts);
    }
  }

  #demandOpen(what: string): void {
    if (this.#database.open) return;
    const path = this.#database.name;
    throw new DaemonError('ARCHIVE_UNUSABLE', `cannot ${what}: the archive is closed`, { path });
  }

  #failure(intent: Intent, what: string, error: unknown, facts: Facts): DaemonError {
    const path = this.#database.name;
    return archiveError(intent, `cannot ${what} in ${path}`, error, { ...facts, path });
  }
}

type Facts = Record<string, string | number>;

function ended(run: number, state: RunState): DaemonError {
  return new DaemonError('DEFECT', `run ${run} is ${state} and stays so`, { run, state });
}
