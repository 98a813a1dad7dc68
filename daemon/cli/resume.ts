// `nightcut resume [RUN]`: an interrupted run goes on where it stopped, as a new segment: home, tie, the last
// positions again, then what is missing.
import { existsSync } from 'node:fs';
import { resolve } from 'node:path';
import type { Command } from 'commander';
import { DaemonError } from '../errors.ts';
import { loadRangeFile } from '../files/load.ts';
import { orderResume } from '../run/order-resume.ts';
import { type RunOptions, runOnRange, withRunOptions } from './run-on-range.ts';
import { runNumber } from './runs.ts';
import type { Finish, Surroundings } from './surroundings.ts';

export function addResumeCommand(program: Command, outside: Surroundings, finish: Finish): void {
  withRunOptions(
    program
      .command('resume')
      .description('go on with an interrupted run where it stopped')
      .argument('[run]', 'number of the run; the newest interrupted one without it', runNumber),
  ).action(async (run: number | undefined, options: RunOptions) => {
    const range = await loadRangeFile(options.range);
    const path = options.archive ? resolve(options.archive) : range.archive;
    if (!existsSync(path))
      throw new DaemonError('FILE_UNREADABLE', `${path}: there is no archive here`, { path });
    await runOnRange(range, options, `resume ${run ?? ''}`.trim(), outside, finish, (archive) =>
      orderResume(range, archive, run, { zeroIsTrue: options.zeroIsTrue ?? false }),
    );
  });
}
