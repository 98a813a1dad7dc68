// How long the night will be and when it ends. An estimate before the analyzer is asked: it may sweep slower.
import type { Plan } from '../../files/plan-file.ts';
import type { RangeFile } from '../../files/range-file.ts';
import { predictStepsMs, timeLeftMs } from '../duration.ts';
import type { PlannedRun, PlannedStep } from '../expand.ts';
import type { Finding } from './finding.ts';
import { durationText } from './wording.ts';

export interface NightLength {
  durationMs: number;
  endWallMs: number;
}

/** Longer than a winter night is dark and quiet. Common practice, no source. */
const longNightMs = 12 * 3_600_000;

/**
 * Moves and settling by plan/duration.ts, and a sweep as points over IF bandwidth times averages: a filter of
 * bandwidth B settles in about 1/B. Ties with the AUT on port 2 drive both ports, one after the other.
 */
export function nightLength(run: PlannedRun, plan: Plan, range: RangeFile, nowWallMs: number): NightLength {
  const { ifBandwidthHz, averages } = plan.analyzer;
  const sweepMs = (1000 * plan.band.points * averages) / ifBandwidthHz;
  const motionMs = timeLeftMs(predictStepsMs(run.steps, range.positioner.axes, 0), 0);
  const sweeps = run.steps.reduce((sum, step) => sum + sweepsOf(step, range), 0);
  const durationMs = motionMs + sweeps * sweepMs;
  return { durationMs, endWallMs: nowWallMs + durationMs };
}

export function checkDuration(length: NightLength): Finding {
  const { durationMs, endWallMs } = length;
  const text = `at least ${durationText(durationMs)} without homing and retries; sweeps reckoned as points over IF bandwidth`;
  const facts = { durationMs, endWallMs };
  if (durationMs <= longNightMs) return { subject: 'duration', verdict: 'go', text, facts };
  const change =
    'longer than a night: fewer points or averages, a wider IF bandwidth, wider steps or fewer cuts';
  return { subject: 'duration', verdict: 'caution', text, change, facts };
}

/** S21 and S11 are driven from one port; S22 needs the other. */
function sweepsOf({ purpose }: PlannedStep, range: RangeFile): number {
  const withMatch = purpose === 'tie' || purpose === 'reference';
  return withMatch && range.analyzer.autPort === 2 ? 2 : 1;
}
