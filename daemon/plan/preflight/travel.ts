// Do all cuts lie within the travel of the axes, cable wrap included, and how far must an axis unwind?
import type { AxisName } from '../../../drivers/positioner/positioner.ts';
import { DaemonError } from '../../errors.ts';
import type { Plan } from '../../files/plan-file.ts';
import type { RangeAxis, RangeFile } from '../../files/range-file.ts';
import { moveMs } from '../duration.ts';
import { expandPlan, type PlannedRun, type PlannedStep } from '../expand.ts';
import { approachStart } from '../sweep.ts';
import type { Finding } from './finding.ts';
import { degreesText } from './wording.ts';

export interface TravelFinding {
  finding: Finding;
  /** The positions of the run; absent where there is no-go. */
  run?: PlannedRun;
}

/** Every cut is looked at by itself, so that all that do not fit are told at once. */
export function checkTravel(plan: Plan, range: RangeFile): TravelFinding {
  const subject = 'travel';
  const refusals = plan.cuts.flatMap((cut) => refusalOf({ ...plan, cuts: [cut] }, range));
  if (refusals.length > 0) {
    const text = refusals.map((refusal) => refusal.text).join('; ');
    const change = refusals.map((refusal) => refusal.change).join('; ');
    return { finding: { subject, verdict: 'no-go', text, change, facts: { cutsRefused: refusals.length } } };
  }
  const run = expandPlan(plan, range);
  const used = range.positioner.axes.map((axis) => usedBy(run.steps, axis));
  const text = used.map((one) => one.text).join('; ');
  const facts = Object.fromEntries(used.flatMap((one) => one.facts));
  return { finding: { subject, verdict: 'go', text, facts }, run };
}

function refusalOf(plan: Plan, range: RangeFile): { text: string; change: string }[] {
  try {
    expandPlan(plan, range);
    return [];
  } catch (error) {
    if (!(error instanceof DaemonError)) throw error;
    // The messages of the expansion end with their remedy.
    const [text = '', ...change] = error.message.split('; ');
    return [{ text, change: change.join('; ') }];
  }
}

function usedBy(steps: readonly PlannedStep[], axis: RangeAxis): { text: string; facts: [string, number][] } {
  const positions = steps.map((step) => step.target[axis.name]!);
  const reached = positions.flatMap((deg) => [deg, approachStart(deg, axis)]);
  const turns = positions.slice(1).map((deg, i) => Math.abs(deg - positions[i]!));
  const largestDeg = turns.reduce((a, b) => Math.max(a, b), 0);
  const range = `of ${degreesText(axis.travelMinDeg)} to ${degreesText(axis.travelMaxDeg)}`;
  if (largestDeg === 0) {
    return { text: `${axis.name} rests at ${degreesText(positions[0]!)} ${range}`, facts: [] };
  }
  const [minDeg, maxDeg] = [lowest(reached), highest(reached)];
  const unwinds = `longest single turn ${degreesText(largestDeg)} in ${Math.ceil(moveMs(axis, 0, largestDeg) / 1000)} s`;
  return {
    text: `${axis.name} uses ${degreesText(minDeg)} to ${degreesText(maxDeg)} ${range}, ${unwinds}`,
    facts: namedByAxis(axis.name, { MinDeg: minDeg, MaxDeg: maxDeg, LongestTurnDeg: largestDeg }),
  };
}

function namedByAxis(axis: AxisName, values: Record<string, number>): [string, number][] {
  return Object.entries(values).map(([name, value]) => [`${axis}${name}`, value]);
}

// A plan may have more steps than a call takes arguments.
const lowest = (values: readonly number[]): number => values.reduce((a, b) => Math.min(a, b));
const highest = (values: readonly number[]): number => values.reduce((a, b) => Math.max(a, b));
