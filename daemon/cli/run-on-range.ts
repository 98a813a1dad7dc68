// What `measure` and `resume` share: archive opened, devices locked and met, the order executed under the eyes
// of log and progress bar, figures printed, exit code chosen.
import { resolve } from 'node:path';
import type { Command } from 'commander';
import type { Archive } from '../archive/archive.ts';
import { lockDevices } from '../archive/device-lock.ts';
import { openArchive } from '../archive/open-archive.ts';
import { closeBench, makeBench } from '../bench.ts';
import { adviceOf, exitCodes } from '../errors.ts';
import type { RangeFile } from '../files/range-file.ts';
import { RunLoop, type RunOrder, type RunOutcome } from '../run/run-loop.ts';
import { progressOn } from './progress.ts';
import { openRunLog } from './run-log.ts';
import { printRun } from './runs.ts';
import type { Finish, Surroundings } from './surroundings.ts';

export interface RunOptions {
  range: string;
  archive?: string;
  json?: boolean;
  zeroIsTrue?: boolean;
}

export function withRunOptions(command: Command): Command {
  return command
    .option('--range <path>', 'what stands on the site', 'range.yaml')
    .option('--archive <path>', 'where runs are kept; the range file names it otherwise')
    .option('--json', 'print the figures as one JSON document')
    .option(
      '--zero-is-true',
      'axes without a home switch stand where the controller counts them: I have looked',
    );
}

/** `work` is what others are told who find the devices held; `order` says what to do once the archive is open. */
export async function runOnRange(
  range: RangeFile,
  options: RunOptions,
  work: string,
  outside: Surroundings,
  finish: Finish,
  order: (archive: Archive) => Promise<RunOrder>,
): Promise<void> {
  const lock = lockDevices([range.analyzer.link, range.positioner.link], { pid: process.pid, work });
  try {
    const archivePath = options.archive ? resolve(options.archive) : range.archive;
    const archive = await openArchive(archivePath);
    try {
      const outcome = await executeWatched(range, await order(archive), archive, archivePath, outside);
      await printRun(archive, outcome.run.number, { json: options.json ?? false }, outside);
      reportOutcome(outcome, outside);
      finish(outcome.error === undefined ? exitCodes.done : adviceOf(outcome.error).exitCode);
      if (outcome.unconfirmed.length > 0) finish(exitCodes.hardware);
    } finally {
      await archive.close();
    }
  } finally {
    lock.release();
  }
}

async function executeWatched(
  range: RangeFile,
  order: RunOrder,
  archive: Archive,
  archivePath: string,
  outside: Surroundings,
): Promise<RunOutcome> {
  const bench = makeBench(range, outside.clock);
  const loop = new RunLoop(bench, archive, outside.clock, order);
  const log = openRunLog(`${archivePath}.log`);
  const progress = progressOn(outside.stderr);
  if (outside.stderr.isTTY) outside.stderr.write('meeting analyzer and positioner …\n');
  const stop = new AbortController();
  const ignoreSignals = outside.onStopSignal(() => stop.abort());
  const watching = loop.events$.subscribe((event) => {
    log.note(event);
    progress.show(event);
  });
  try {
    const outcome = await loop.execute(stop.signal);
    if (outcome.error !== undefined) log.failed(outcome.error);
    return outcome;
  } catch (error) {
    log.failed(error);
    throw error;
  } finally {
    progress.stop();
    watching.unsubscribe();
    ignoreSignals();
    await closeBench(bench);
  }
}

function reportOutcome(outcome: RunOutcome, outside: Surroundings): void {
  if (outcome.error !== undefined) {
    const { error } = outcome;
    const advice = adviceOf(error);
    outside.stderr.write(`run ${outcome.run.number} ended early: ${(error as Error).message}\n`);
    outside.stderr.write(`${advice.meaning} ${advice.nextStep}\n`);
  }
  for (const trouble of outcome.unconfirmed) {
    outside.stderr.write(
      `NOT CONFIRMED: ${(trouble as Error).message}. Stand clear and check the motors and the source yourself.\n`,
    );
  }
}
