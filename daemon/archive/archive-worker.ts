// The other side of worker-archive.ts: opens the file, then answers one request after the other, in the
// order in which they came. Started as a worker thread only.
import { parentPort, type Transferable, workerData } from 'node:worker_threads';
import { DaemonError } from '../errors.ts';
import type { SampleRecord } from './archive.ts';
import type { DatabaseOptions } from './open-database.ts';
import { SqliteStore } from './sqlite-store.ts';
import { type ArchiveAnswer, type ArchiveRequest, failureOf, openedId } from './worker-messages.ts';

export interface WorkerStart {
  path: string;
  options: DatabaseOptions;
}

if (parentPort === null) throw new DaemonError('DEFECT', 'archive-worker is started as a worker thread only');
const port = parentPort;

/** Traces just read belong to nobody else here: their memory is handed over instead of copied. */
function transferable(request: ArchiveRequest, result: unknown): Transferable[] {
  if (request.call !== 'samples') return [];
  return (result as SampleRecord[]).flatMap(({ traces }) =>
    [...traces.values()].map((values) => values.buffer as ArrayBuffer),
  );
}

function answer(store: SqliteStore, request: ArchiveRequest): void {
  try {
    // The two ends share their types; each request carries the arguments of its own call.
    const call = store[request.call] as (...args: unknown[]) => unknown;
    const result = call.apply(store, request.args);
    port.postMessage({ id: request.id, result } satisfies ArchiveAnswer, transferable(request, result));
  } catch (error) {
    port.postMessage({ id: request.id, failure: failureOf(error) } satisfies ArchiveAnswer);
  }
  if (request.call === 'close') port.close();
}

function start({ path, options }: WorkerStart): void {
  try {
    const store = SqliteStore.open(path, options);
    port.on('message', (request: ArchiveRequest) => answer(store, request));
    port.postMessage({ id: openedId, result: undefined } satisfies ArchiveAnswer);
  } catch (error) {
    port.postMessage({ id: openedId, failure: failureOf(error) } satisfies ArchiveAnswer);
    port.close();
  }
}

start(workerData as WorkerStart);
