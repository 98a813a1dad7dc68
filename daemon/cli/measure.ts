// `nightcut measure PLAN`: both files checked, then the run executed. Everything that can be wrong with the
// files is found before any device is spoken to.
import { basename } from 'node:path';
import type { Command } from 'commander';
import { loadPlan, loadRangeFile } from '../files/load.ts';
import type { Plan } from '../files/plan-file.ts';
import type { RangeFile } from '../files/range-file.ts';
import { orderRun } from '../run/order-run.ts';
import { type RunOptions, runOnRange, withRunOptions } from './run-on-range.ts';
import type { Finish, Surroundings } from './surroundings.ts';

export function addMeasureCommand(program: Command, outside: Surroundings, finish: Finish): void {
  withRunOptions(
    program
      .command('measure')
      .description('execute a plan: home, ties, cuts, figures')
      .argument('<plan>', 'what to measure, such as yagi.plan.yaml'),
  ).action(async (planPath: string, options: RunOptions) => {
    const range = await loadRangeFile(options.range);
    const plan = await loadPlan(planPath);
    await measure(range, plan, options, outside, finish);
  });
}

async function measure(
  range: RangeFile,
  plan: Plan,
  options: RunOptions,
  outside: Surroundings,
  finish: Finish,
): Promise<void> {
  const draft = orderRun(range, plan);
  await runOnRange(range, options, `measure ${basename(plan.path)}`, outside, finish, (archive) =>
    draft.complete(archive, { zeroIsTrue: options.zeroIsTrue ?? false }),
  );
}
