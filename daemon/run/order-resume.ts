// An interrupted run on the range as it stands now → the order that takes what is missing. The plan is the
// frozen one; links may have changed since, what is measured with may not.
import { isDeepStrictEqual } from 'node:util';
import type { Archive, RunRecord, SampleRecord } from '../archive/archive.ts';
import { DaemonError } from '../errors.ts';
import type { Plan } from '../files/plan-file.ts';
import type { RangeFile } from '../files/range-file.ts';
import { predictStepsMs } from '../plan/duration.ts';
import { expandPlan, type PlannedStep } from '../plan/expand.ts';
import { remaining } from '../plan/remaining.ts';
import { lastRest } from './axis-rest.ts';
import { type OrderOptions, sweepOf } from './order-run.ts';
import type { ResumePoint, RunOrder } from './run-loop.ts';

/** Positions taken again before anything new. */
const repeatedPositions = 2;

/** `number`: the run, or the newest that can go on. Throws RUN_NOT_RESUMABLE, ARCHIVE_NO_SUCH_RUN. */
export async function orderResume(
  range: RangeFile,
  archive: Archive,
  number: number | undefined,
  options: OrderOptions = {},
): Promise<RunOrder> {
  const run = await archive.run(number ?? (await newestResumable(archive, range.name)));
  refuseUnfit(run, range);
  const plan = run.plan as Plan;
  const samples = await archive.samples(run.number);
  const segments = await archive.segments(run.number);
  const steps = remaining(expandPlan(plan, range).steps, samples);
  const rest = options.zeroIsTrue ? undefined : await lastRest(archive, range.name);
  const { axes } = range.positioner;
  return {
    record: run,
    sweep: sweepOf(range, plan),
    steps,
    motionMs: predictStepsMs(steps, axes, 0),
    boresight: Object.fromEntries(axes.map((axis) => [axis.name, axis.boresightDeg])),
    autPort: range.analyzer.autPort,
    ...(rest ? { lastRest: rest } : {}),
    resume: {
      run: { number: run.number, uuid: run.uuid },
      segments: Math.max(0, ...segments.map((segment) => segment.segment)),
      samples: Math.max(0, ...samples.map((sample) => sample.sequence)),
      repeats: lastPositions(samples),
    },
  };
}

/** `running` is what a process leaves that died; the device lock keeps us from one that lives. */
async function newestResumable(archive: Archive, range: string): Promise<number> {
  const runs = await archive.runs();
  const newest = runs.find((run) => run.range === range && isResumable(run.state));
  if (newest) return newest.number;
  throw new DaemonError('RUN_NOT_RESUMABLE', `no run on range ${range} was interrupted`, { range });
}

function isResumable(state: RunRecord['state']): boolean {
  return state === 'interrupted' || state === 'running';
}

function refuseUnfit(run: RunRecord, range: RangeFile): void {
  const refuse = (why: string): never => {
    throw new DaemonError('RUN_NOT_RESUMABLE', `run ${run.number} ${why}`, {
      run: run.number,
      state: run.state,
    });
  };
  if (!isResumable(run.state)) refuse(`is ${run.state}: there is nothing to go on with`);
  if (run.range !== range.name) refuse(`was taken on range ${run.range}, not on ${range.name}`);
  const before = comparable(run.rangeFile as RangeFile);
  const now = comparable(range);
  const changed = Object.keys(now).find((key) => !isDeepStrictEqual(before[key], now[key]));
  if (changed) refuse(`was begun with another ${changed} in the range file; restore it, or measure anew`);
}

/** What a measurement depends on: all but where the devices are reached and where the archive is. */
function comparable(range: RangeFile): Record<string, unknown> {
  const { analyzer, positioner, rangeLengthM, rangeAntenna, reference, heights } = range;
  const { link: _a, ...analyzerRest } = analyzer;
  const { link: _p, ...positionerRest } = positioner;
  const parts = {
    analyzer: analyzerRest,
    positioner: positionerRest,
    rangeLengthM,
    rangeAntenna,
    reference,
    heights,
  };
  // As the archive keeps it: what is undefined is absent.
  return JSON.parse(JSON.stringify(parts));
}

function lastPositions(samples: readonly SampleRecord[]): ResumePoint['repeats'] {
  const taken = samples.filter((sample) => sample.purpose === 'cut' && sample.traces.has('S21'));
  return taken.slice(-repeatedPositions).map((sample) => {
    const { cut, axis, angleDeg, target } = sample;
    const component = sample.component === 'cross' ? 'cross' : 'co';
    const step: PlannedStep = { purpose: 'repeat', cut, axis, angleDeg, target, component };
    return { step, trace: sample.traces.get('S21')! };
  });
}
