// What the thread between caller and store may do wrong: die, fail to open, be asked the impossible.
import { Worker } from 'node:worker_threads';
import { describe, expect, it } from 'vitest';
import { WorkerArchive } from '../../../../daemon/archive/worker-archive.ts';
import { event, failure, newRun, sample } from './records.ts';

/** A worker that runs this text instead of the archive's. */
function workerOf(program: string): Worker {
  return new Worker(`const { parentPort, workerData } = require('node:worker_threads'); ${program}`, {
    eval: true,
    workerData: {},
  });
}

describe('archive on a worker', () => {
  it.each([
    ['exits', 'process.exit(3)', 'its thread has ended (3)'],
    ['throws', "throw new Error('out of memory')", 'its thread failed'],
  ])('fails everything pending and everything later when the thread %s', async (_how, act, because) => {
    const archive = new WorkerArchive(workerOf(`parentPort.on('message', () => { ${act} });`));
    const pending = [
      archive.opened,
      archive.addSample(1, sample(1)),
      archive.runs(),
      archive.createRun(newRun),
    ];
    const errors = await Promise.all(pending.map((call) => failure('ARCHIVE_WRITE_FAILED', () => call)));
    for (const error of errors) expect(error.message).toContain(because);
    expect(errors[0]!.facts).toMatchObject({ pending: 4 });
    if (act.startsWith('throw')) expect(errors[0]!.cause).toMatchObject({ message: 'out of memory' });
    await failure('ARCHIVE_WRITE_FAILED', () => archive.addEvent(1, event));
    await archive.close();
  });

  it('does not announce a sample that the thread took and did not answer', async () => {
    const answering = `let asked = 0; parentPort.on('message', ({ id }) => {
      asked += 1;
      if (asked === 1) parentPort.postMessage({ id, result: undefined });
      else process.exit(0);
    });`;
    const archive = new WorkerArchive(workerOf(answering));
    await archive.addSample(1, sample(1));
    const error = await failure('ARCHIVE_WRITE_FAILED', () => archive.addSample(1, sample(2)));
    expect(error.facts).toMatchObject({ pending: 2 });
    await archive.close();
  });

  it('gives each answer to the call with its number, in whatever order they come', async () => {
    const backwards = `const ids = []; parentPort.on('message', ({ id, call }) => {
      ids.push(id);
      if (ids.length === 3) for (const one of ids.reverse()) parentPort.postMessage({ id: one, result: one });
      if (call === 'close') { parentPort.postMessage({ id, result: undefined }); parentPort.close(); }
    });`;
    const archive = new WorkerArchive(workerOf(backwards));
    expect(await Promise.all([archive.runs(), archive.run(1), archive.events(1)])).toEqual([1, 2, 3]);
    await archive.close();
  });

  it('rebuilds an error that crosses with code, facts and cause', async () => {
    const failing = `parentPort.on('message', ({ id, call }) => {
      if (call === 'close') { parentPort.postMessage({ id, result: undefined }); parentPort.close(); return; }
      const cause = { name: 'SqliteError', message: 'disk I/O error' };
      const failure = { code: 'ARCHIVE_WRITE_FAILED', message: 'no', facts: { sequence: 8 }, cause };
      parentPort.postMessage({ id, failure });
    });`;
    const archive = new WorkerArchive(workerOf(failing));
    const error = await failure('ARCHIVE_WRITE_FAILED', () => archive.addSample(1, sample(8)));
    expect(error.facts).toEqual({ sequence: 8 });
    expect(error.cause).toBeInstanceOf(Error);
    expect(error.cause).toMatchObject({ name: 'SqliteError', message: 'disk I/O error' });
    await archive.close();
  });

  it('waits with close until the thread has ended', async () => {
    const worker = workerOf(`parentPort.on('message', ({ id }) => {
      parentPort.postMessage({ id, result: undefined });
      setTimeout(() => parentPort.close(), 30);
    });`);
    let ended = false;
    worker.on('exit', () => {
      ended = true;
    });
    await new WorkerArchive(worker).close();
    expect(ended).toBe(true);
  });
});
