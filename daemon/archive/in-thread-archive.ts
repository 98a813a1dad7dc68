// The archive in the caller's own thread: promises around the synchronous store. For simulated nights, where
// a call must not take real time, and for short commands. A daemon that drives hardware uses worker-archive.ts.
import { randomUUID } from 'node:crypto';
import type {
  Archive,
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
import type { DatabaseOptions } from './open-database.ts';
import { SqliteStore } from './sqlite-store.ts';

export interface ArchiveOptions extends DatabaseOptions {
  /** Makes the UUID of each run; a seeded one makes a night repeatable. */
  newUuid?: () => string;
}

export class InThreadArchive implements Archive {
  readonly #store: SqliteStore;
  readonly #newUuid: () => string;

  constructor(store: SqliteStore, newUuid: () => string = randomUUID) {
    this.#store = store;
    this.#newUuid = newUuid;
  }

  /** `path` names a file or is `:memory:`. Throws ARCHIVE_UNUSABLE, ARCHIVE_NEWER, ARCHIVE_DAMAGED. */
  static open(path: string, options: ArchiveOptions = {}): InThreadArchive {
    return new InThreadArchive(SqliteStore.open(path, options), options.newUuid);
  }

  async createRun(run: NewRun): Promise<RunRef> {
    return this.#store.createRun(run, this.#newUuid());
  }

  async addSegment(run: number, segment: SegmentRecord): Promise<void> {
    this.#store.addSegment(run, segment);
  }

  async addSetup(run: number, setup: SetupRecord): Promise<void> {
    this.#store.addSetup(run, setup);
  }

  async addSample(run: number, sample: SampleRecord): Promise<void> {
    this.#store.addSample(run, sample);
  }

  async addEvent(run: number, event: RunEventRecord): Promise<void> {
    this.#store.addEvent(run, event);
  }

  async endRun(
    run: number,
    state: Exclude<RunState, 'running'>,
    endedWallMs: number,
    reason?: string,
  ): Promise<void> {
    this.#store.endRun(run, state, endedWallMs, reason);
  }

  async runs(): Promise<RunSummary[]> {
    return this.#store.runs();
  }

  async run(number: number): Promise<RunRecord> {
    return this.#store.run(number);
  }

  async segments(run: number): Promise<SegmentRecord[]> {
    return this.#store.segments(run);
  }

  async setups(run: number): Promise<SetupRecord[]> {
    return this.#store.setups(run);
  }

  async samples(run: number, filter?: SampleFilter): Promise<SampleRecord[]> {
    return this.#store.samples(run, filter);
  }

  async events(run: number): Promise<RunEventRecord[]> {
    return this.#store.events(run);
  }

  async close(): Promise<void> {
    this.#store.close();
  }
}
