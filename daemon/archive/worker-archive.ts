// The archive on a thread of its own, so that a slow disk never keeps the control thread from a stop. The
// calls are those of the store, numbered and sent over; a write's promise resolves when the other side has
// committed. When that thread dies, everything asked of it fails, and so does everything asked later.
import { randomUUID } from 'node:crypto';
import type { Worker } from 'node:worker_threads';
import { DaemonError } from '../errors.ts';
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
import {
  type ArchiveAnswer,
  type ArchiveRequest,
  type CallArguments,
  type CallResult,
  errorOf,
  openedId,
  type StoreCall,
} from './worker-messages.ts';

interface Waiter {
  resolve(result: unknown): void;
  reject(error: DaemonError): void;
}

export class WorkerArchive implements Archive {
  /** Settles when the file is open, or could not be opened. */
  readonly opened: Promise<void>;
  readonly #worker: Worker;
  readonly #newUuid: () => string;
  readonly #waiting = new Map<number, Waiter>();
  readonly #exited: Promise<void>;
  #lastId = openedId;
  #lost: DaemonError | undefined;
  #closing: Promise<void> | undefined;

  /** Takes the worker over: nobody else may talk to it. It must run archive-worker. */
  constructor(worker: Worker, newUuid: () => string = randomUUID) {
    this.#worker = worker;
    this.#newUuid = newUuid;
    this.opened = this.#wait(openedId) as Promise<void>;
    // Whoever does not ask for it learns of the failure from the first call.
    this.opened.catch(() => {});
    this.#exited = new Promise((resolve) => worker.once('exit', () => resolve()));
    worker.on('message', (answer: ArchiveAnswer) => this.#settle(answer));
    worker.on('messageerror', (error) => this.#lose('its answer could not be read', error));
    worker.on('error', (error) => this.#lose('its thread failed', error));
    worker.on('exit', (exitCode) => this.#lose(`its thread has ended (${exitCode})`));
  }

  createRun(run: NewRun): Promise<RunRef> {
    return this.#call('createRun', run, this.#newUuid());
  }

  addSegment(run: number, segment: SegmentRecord): Promise<void> {
    return this.#call('addSegment', run, segment);
  }

  addSetup(run: number, setup: SetupRecord): Promise<void> {
    return this.#call('addSetup', run, setup);
  }

  /** The traces are copied as they are now; the caller may go on using them. */
  addSample(run: number, sample: SampleRecord): Promise<void> {
    return this.#call('addSample', run, sample);
  }

  addEvent(run: number, event: RunEventRecord): Promise<void> {
    return this.#call('addEvent', run, event);
  }

  endRun(
    run: number,
    state: Exclude<RunState, 'running'>,
    endedWallMs: number,
    reason?: string,
  ): Promise<void> {
    return this.#call('endRun', run, state, endedWallMs, reason);
  }

  runs(): Promise<RunSummary[]> {
    return this.#call('runs');
  }

  run(number: number): Promise<RunRecord> {
    return this.#call('run', number);
  }

  segments(run: number): Promise<SegmentRecord[]> {
    return this.#call('segments', run);
  }

  setups(run: number): Promise<SetupRecord[]> {
    return this.#call('setups', run);
  }

  samples(run: number, filter?: SampleFilter): Promise<SampleRecord[]> {
    return this.#call('samples', run, filter);
  }

  events(run: number): Promise<RunEventRecord[]> {
    return this.#call('events', run);
  }

  /** Waits for everything asked before, and for the thread to end. A thread already lost is closed. */
  close(): Promise<void> {
    this.#closing ??= this.#close();
    return this.#closing;
  }

  async #close(): Promise<void> {
    if (this.#lost === undefined) await this.#send('close');
    await this.#exited;
  }

  #call<C extends StoreCall>(call: C, ...args: CallArguments<C>): Promise<CallResult<C>> {
    if (this.#closing === undefined) return this.#send(call, ...args);
    return Promise.reject(new DaemonError('ARCHIVE_UNUSABLE', `cannot ${call}: the archive is closed`));
  }

  #send<C extends StoreCall>(call: C, ...args: CallArguments<C>): Promise<CallResult<C>> {
    if (this.#lost !== undefined) return Promise.reject(this.#lost);
    this.#lastId += 1;
    const id = this.#lastId;
    const answer = this.#wait(id) as Promise<CallResult<C>>;
    try {
      this.#worker.postMessage({ id, call, args } satisfies ArchiveRequest<C>);
    } catch (error) {
      const message = `cannot ${call}: a value in it cannot be sent to the archive`;
      this.#take(id)?.reject(new DaemonError('DEFECT', message, { call }, error));
    }
    return answer;
  }

  /** While an answer is due the thread keeps the process alive; idle it does not. */
  #wait(id: number): Promise<unknown> {
    this.#worker.ref();
    return new Promise((resolve, reject) => this.#waiting.set(id, { resolve, reject }));
  }

  #take(id: number): Waiter | undefined {
    const waiter = this.#waiting.get(id);
    this.#waiting.delete(id);
    if (this.#waiting.size === 0 && this.#closing === undefined) this.#worker.unref();
    return waiter;
  }

  #settle(answer: ArchiveAnswer): void {
    const waiter = this.#take(answer.id);
    if ('failure' in answer) waiter?.reject(errorOf(answer.failure));
    else waiter?.resolve(answer.result);
  }

  #lose(because: string, cause?: unknown): void {
    if (this.#lost !== undefined) return;
    const pending = this.#waiting.size;
    const message = `the archive is lost: ${because}`;
    this.#lost = new DaemonError('ARCHIVE_WRITE_FAILED', message, { pending }, cause);
    for (const id of [...this.#waiting.keys()]) this.#take(id)?.reject(this.#lost);
  }
}
