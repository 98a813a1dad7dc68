// Range file and plan → the order a run executes. What the files alone can tell is checked first, so that
// a wrong plan is refused before an archive is opened or a device spoken to; the gain reference comes next.
import type { SParameter, SweepSetup } from '../../drivers/analyzer/analyzer.ts';
import type { Archive } from '../archive/archive.ts';
import { DaemonError } from '../errors.ts';
import type { Plan } from '../files/plan-file.ts';
import type { RangeFile } from '../files/range-file.ts';
import { predictStepsMs } from '../plan/duration.ts';
import { expandPlan } from '../plan/expand.ts';
import { findGainReference } from '../results/gain-reference.ts';
import { lastRest } from './axis-rest.ts';
import type { RunOrder } from './run-loop.ts';

export interface OrderOptions {
  /** The operator vouches that the controller counts the axes truly, whatever the last run left. */
  zeroIsTrue?: boolean;
}

export interface OrderDraft {
  /** Looks up gain reference and last rest. Throws REFERENCE_MISSING, REFERENCE_DOES_NOT_FIT. */
  complete(archive: Archive, options?: OrderOptions): Promise<RunOrder>;
}

/** Throws PLAN_OUTSIDE_TRAVEL, PLAN_AXIS_UNKNOWN; for a reference run REFERENCE_MISSING, REFERENCE_DOES_NOT_FIT. */
export function orderRun(range: RangeFile, plan: Plan): OrderDraft {
  const { steps } = expandNamed(plan, range);
  if (plan.kind === 'reference') refuseUselessReference(range, plan);
  const { axes } = range.positioner;
  return {
    async complete(archive, options = {}) {
      const gainReference = await findGainReference(archive, plan, range);
      const rest = options.zeroIsTrue ? undefined : await lastRest(archive, range.name);
      return {
        record: {
          kind: plan.kind,
          antenna: plan.antenna,
          range: range.name,
          planText: plan.text,
          plan,
          rangeText: range.text,
          rangeFile: range,
          ...(gainReference ? { gainReference } : {}),
        },
        sweep: sweepOf(range, plan),
        steps,
        motionMs: predictStepsMs(steps, axes, 0),
        boresight: Object.fromEntries(axes.map((axis) => [axis.name, axis.boresightDeg])),
        ...(rest ? { lastRest: rest } : {}),
        autPort: range.analyzer.autPort,
      };
    },
  };
}

/** As `expandPlan`, the file named in what it refuses. */
function expandNamed(plan: Plan, range: RangeFile): ReturnType<typeof expandPlan> {
  try {
    return expandPlan(plan, range);
  } catch (error) {
    if (!(error instanceof DaemonError)) throw error;
    throw new DaemonError(error.code, `${plan.path}: ${error.message}`, error.facts, error);
  }
}

/** Both the transmission and the match of the AUT are recorded in every sweep; a sample reads what it needs. */
export function sweepOf(range: RangeFile, plan: Plan): SweepSetup {
  const parameters: SParameter[] = range.analyzer.autPort === 1 ? ['S21', 'S11'] : ['S21', 'S22'];
  return { ...plan.band, ...plan.analyzer, parameters };
}

/** A reference run from which no gain could be taken is refused before a night is spent on it. */
function refuseUselessReference(range: RangeFile, plan: Plan): void {
  const { reference } = range;
  if (reference && reference.name !== plan.antenna.name) {
    throw new DaemonError(
      'REFERENCE_DOES_NOT_FIT',
      `${plan.path}: measures ${plan.antenna.name}, but the gain table of the range file is that of ${reference.name}; give them one name`,
      { antenna: plan.antenna.name, reference: reference.name },
    );
  }
  if (!reference) {
    throw new DaemonError(
      'REFERENCE_MISSING',
      `${range.path} names no reference antenna; a plan of kind reference needs antennas.reference with its gain table`,
      { range: range.name },
    );
  }
  const firstHz = reference.table[0]?.frequencyHz ?? Number.NaN;
  const lastHz = reference.table.at(-1)?.frequencyHz ?? Number.NaN;
  const { startHz, stopHz } = plan.band;
  if (firstHz <= startHz && lastHz >= stopHz) return;
  throw new DaemonError(
    'REFERENCE_DOES_NOT_FIT',
    `${range.path}: the gain table of ${reference.name} covers ${firstHz / 1e6} to ${lastHz / 1e6} MHz, ` +
      `the plan ${startHz / 1e6} to ${stopHz / 1e6} MHz; widen the table or narrow the band`,
    { tableStartHz: firstHz, tableStopHz: lastHz, startHz, stopHz },
  );
}
