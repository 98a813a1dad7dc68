// Opens the archive the way a daemon does: on a worker thread. The only file that knows how that thread is
// started, from sources as well as from the built package.
import { Worker } from 'node:worker_threads';
import type { Archive } from './archive.ts';
import type { WorkerStart } from './archive-worker.ts';
import type { ArchiveOptions } from './in-thread-archive.ts';
import { WorkerArchive } from './worker-archive.ts';

/**
 * Opens or makes the archive at `path`, on a worker thread. Throws ARCHIVE_UNUSABLE, ARCHIVE_NEWER,
 * ARCHIVE_DAMAGED. Reading while another process writes the same file works.
 */
export async function openArchive(path: string, options: ArchiveOptions = {}): Promise<Archive> {
  const { newUuid, ...databaseOptions } = options;
  const archive = new WorkerArchive(startWorker({ path, options: databaseOptions }), newUuid);
  await archive.opened;
  return archive;
}

/**
 * As built the worker needs nothing; as a source file it needs the loader that this module came through.
 * Node 20 registers that loader in the main thread alone, so the worker does so itself before its entry.
 */
function startWorker(start: WorkerStart): Worker {
  const asSource = import.meta.url.endsWith('.ts');
  const file = new URL(asSource ? './archive-worker.ts' : './archive-worker.js', import.meta.url);
  if (!asSource) return new Worker(file, { workerData: start });
  const loader = import.meta.resolve('tsx/esm/api');
  const program = `import { register } from ${JSON.stringify(loader)}; register();`;
  const execArgv = ['--import', `data:text/javascript,${encodeURIComponent(program)}`];
  return new Worker(file, { workerData: start, execArgv });
}
