// A plan on a range to the positions of a run, in order, all within travel. Pure: moves nothing, reads
// nothing. Follows files/, precedes run/.
import type { AxisName, Position } from '../../drivers/positioner/positioner.ts';
import type { SamplePurpose } from '../archive/archive.ts';
import { DaemonError } from '../errors.ts';
import { nearestWord } from '../files/nearest-word.ts';
import type { Plan, PlanCut } from '../files/plan-file.ts';
import type { RangeAxis, RangeFile } from '../files/range-file.ts';
import { approachStart, directPosition, isFullTurn, positionFor, sweepOf } from './sweep.ts';

export interface PlannedStep {
  purpose: SamplePurpose;
  /** The cut it belongs to or, for ties, is taken for; '' for boresight samples of a reference run. */
  cut: string;
  /** Swept axis and its pattern angle as the plan counts it (from … to); '' and 0 where there is none. */
  axis: AxisName;
  angleDeg: number;
  /** Every axis of the range, in its own coordinate. */
  target: Position;
  component: 'co' | 'cross';
}

/** How one cut will be swept, for the operator to see before the night. */
export interface PlannedSweep {
  cut: string;
  axis: AxisName;
  /** Samples with the closure, without ties. */
  samples: number;
  /** Coordinates of the swept axis at the first and last sample. */
  firstDeg: number;
  lastDeg: number;
}

export interface PlannedRun {
  steps: readonly PlannedStep[];
  sweeps: readonly PlannedSweep[];
}

/** Boresight samples of a reference run: enough for a mean and its scatter. */
export const referenceSamples = 5;

type PlannedRange = Pick<RangeFile, 'name'> & { positioner: Pick<RangeFile['positioner'], 'axes'> };

/**
 * Each cut is tie, samples with a tie after every `tieEverySamples` of them, tie; ties are at boresight
 * of all axes. The last sample of a full turn is its closure. A run of kind `reference` begins with five
 * boresight samples. Throws PLAN_AXIS_UNKNOWN and PLAN_OUTSIDE_TRAVEL.
 */
export function expandPlan(plan: Plan, range: PlannedRange): PlannedRun {
  const { axes } = range.positioner;
  const boresight: Position = Object.fromEntries(axes.map((axis) => [axis.name, directPosition(0, axis)]));
  const steps: PlannedStep[] = [];
  const sweeps: PlannedSweep[] = [];
  if (plan.kind === 'reference') steps.push(...referenceSteps(boresight));
  for (const cut of plan.cuts) {
    const samples = samplesOf(cut, range);
    const tie: PlannedStep = {
      purpose: 'tie',
      cut: cut.name,
      axis: cut.axis,
      angleDeg: 0,
      target: boresight,
      component: cut.component,
    };
    steps.push(...withTies(samples, tie, plan.tieEverySamples));
    sweeps.push({
      cut: cut.name,
      axis: cut.axis,
      samples: samples.length,
      firstDeg: samples[0]!.target[cut.axis]!,
      lastDeg: samples.at(-1)!.target[cut.axis]!,
    });
  }
  return { steps, sweeps };
}

function referenceSteps(boresight: Position): PlannedStep[] {
  const step = { purpose: 'reference', cut: '', axis: '', angleDeg: 0, component: 'co' } as const;
  return Array.from({ length: referenceSamples }, () => ({ ...step, target: boresight }));
}

function withTies(samples: readonly PlannedStep[], tie: PlannedStep, every: number): PlannedStep[] {
  const steps = [tie];
  for (const [i, sample] of samples.entries()) {
    steps.push(sample);
    if ((i + 1) % every === 0 || i === samples.length - 1) steps.push(tie);
  }
  return steps;
}

function samplesOf(cut: PlanCut, range: PlannedRange): PlannedStep[] {
  const swept = axisNamed(cut.axis, cut, range);
  const others = otherPositions(cut, range);
  const sweep = sweepOf(cut, swept);
  if (sweep.kind === 'absent') throw outsideTravel(cut, swept, sweep.at.angleDeg, sweep.outsideDeg);
  const last = sweep.points.length - 1;
  return sweep.points.map(({ angleDeg, positionDeg }, i) => ({
    purpose: i === last && isFullTurn(cut) ? 'closure' : 'cut',
    cut: cut.name,
    axis: cut.axis,
    angleDeg,
    target: { ...others, [cut.axis]: positionDeg },
    component: cut.component,
  }));
}

/** Where the axes stand that the cut does not sweep. */
function otherPositions(cut: PlanCut, range: PlannedRange): Position {
  for (const name of Object.keys(cut.at)) axisNamed(name, cut, range);
  const others = range.positioner.axes.filter((axis) => axis.name !== cut.axis);
  return Object.fromEntries(
    others.map((axis) => {
      const angleDeg = Object.hasOwn(cut.at, axis.name) ? cut.at[axis.name]! : 0;
      const positionDeg = positionFor(angleDeg, axis);
      if (positionDeg === undefined)
        throw outsideTravel(cut, axis, angleDeg, neededCoordinate(angleDeg, axis));
      return [axis.name, positionDeg];
    }),
  );
}

function neededCoordinate(angleDeg: number, axis: RangeAxis): number {
  const direct = directPosition(angleDeg, axis);
  const inside = direct >= axis.travelMinDeg && direct <= axis.travelMaxDeg;
  return inside ? approachStart(direct, axis) : direct;
}

function axisNamed(name: string, cut: PlanCut, range: PlannedRange): RangeAxis {
  const axis = range.positioner.axes.find((one) => one.name === name);
  if (axis) return axis;
  const known = range.positioner.axes.map((one) => one.name);
  const near = nearestWord(name, known);
  const hint = near === undefined ? `its axes are ${known.join(', ')}` : `did you mean ${near}?`;
  throw new DaemonError(
    'PLAN_AXIS_UNKNOWN',
    `cut ${cut.name}: range ${range.name} has no axis ${name}; ${hint}`,
    { cut: cut.name, axis: name, known: known.join(', ') },
  );
}

function outsideTravel(cut: PlanCut, axis: RangeAxis, angleDeg: number, neededDeg: number): DaemonError {
  const { name, travelMinDeg, travelMaxDeg, approachDeg } = axis;
  const isApproach = neededDeg !== directPosition(angleDeg, axis);
  const needs = isApproach ? `needs ${name} to begin its approach at` : `needs ${name} at`;
  const remedy = isApproach
    ? `leave ${approachDeg} deg for the approach, by a narrower cut or wider travel`
    : 'narrow the cut, widen the travel in the range file or move its boresight';
  return new DaemonError(
    'PLAN_OUTSIDE_TRAVEL',
    `cut ${cut.name}: pattern angle ${angleDeg} deg ${needs} ${neededDeg} deg, ` +
      `outside its travel of ${travelMinDeg} to ${travelMaxDeg} deg; ${remedy}`,
    { cut: cut.name, axis: name, angleDeg, positionDeg: neededDeg, travelMinDeg, travelMaxDeg },
  );
}
