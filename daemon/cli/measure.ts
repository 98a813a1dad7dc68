// `nightcut measure PLAN`: files checked, archive opened, devices met, the run executed, figures printed.
// Everything that can be wrong with the files is found before any device is spoken to.
import { resolve } from 'node:path';
import type { Command } from 'commander';
import type { Archive } from '../archive/archive.ts';
import { openArchive } from '../archive/open-archive.ts';
import { closeBench, makeBench } from '../bench.ts';
import { adviceOf, exitCodes } from '../errors.ts';
import { loadPlan, loadRangeFile } from '../files/load.ts';
import type { Plan } from '../files/plan-file.ts';
import type { RangeFile } from '../files/range-file.ts';
import { orderRun } from '../run/order-run.ts';
import { RunLoop, type RunOutcome } from '../run/run-loop.ts';
import { progressOn } from './progress.ts';
import { openRunLog } from './run-log.ts';
import { printRun } from './runs.ts';
import type { Finish, Surroundings } from './surroundings.ts';

interface MeasureOptions {
  range: string;
  archive?: string;
  json?: boolean;
  zeroIsTrue?: boolean;
}

export function addMeasureCommand(program: Command, outside: Surroundings, finish: Finish): void {
  program
    .command('measure')
    .description('execute a plan: home, ties, cuts, figures')
    .argument('<plan>', 'what to measure, such as yagi.plan.yaml')
    .option('--range <path>', 'what stands on the site', 'range.yaml')
    .option('--archive <path>', 'where runs are kept; the range file names it otherwise')
    .option('--json', 'print the figures as one JSON document')
    .option(
      '--zero-is-true',
      'axes without a home switch stand where the controller counts them: I have looked',
    )
    .action(async (planPath: string, options: MeasureOptions) => {
      const range = await loadRangeFile(options.range);
      const plan = await loadPlan(planPath);
      await measure(range, plan, options, outside, finish);
    });
}

async function measure(
  range: RangeFile,
  plan: Plan,
  options: MeasureOptions,
  outside: Surroundings,
  finish: Finish,
): Promise<void> {
  const order = orderRun(range, plan);
  const archivePath = options.archive ? resolve(options.archive) : range.archive;
  const archive = await openArchive(archivePath);
  try {
    const outcome = await executeWatched(
      range,
      await order.complete(archive, { zeroIsTrue: options.zeroIsTrue ?? false }),
      archive,
      archivePath,
      outside,
    );
    await printRun(archive, outcome.run.number, { json: options.json ?? false }, outside);
    reportOutcome(outcome, outside);
    finish(outcome.error === undefined ? exitCodes.done : adviceOf(outcome.error).exitCode);
    if (outcome.unconfirmed.length > 0) finish(exitCodes.hardware);
  } finally {
    await archive.close();
  }
}

async function executeWatched(
  range: RangeFile,
  order: ConstructorParameters<typeof RunLoop>[3],
  archive: Archive,
  archivePath: string,
  outside: Surroundings,
): Promise<RunOutcome> {
  const bench = makeBench(range, outside.clock);
  const loop = new RunLoop(bench, archive, outside.clock, order);
  const log = openRunLog(`${archivePath}.log`);
  const progress = progressOn(outside.stderr);
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
