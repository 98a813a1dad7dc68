// How long a run will take, from how axes move and how long a sweep lasts: for the operator before the
// night and for the time left on the progress bar. An estimate: it knows nothing of retries and holds.
import type { AxisSetup, Position } from '../../drivers/positioner/positioner.ts';
import type { PlannedStep } from './expand.ts';

/** The whole run in milliseconds. `acquisitionMs` is PreparedSweep.acquisitionMs. */
export function predictDurationMs(
  steps: readonly PlannedStep[],
  axes: readonly AxisSetup[],
  acquisitionMs: number,
  from?: Position,
): number {
  return timeLeftMs(predictStepsMs(steps, axes, acquisitionMs, from), 0);
}

/**
 * Milliseconds of each step: move, settle, acquire. Without `from` the way to the first target is not
 * counted, but its approach and settling are.
 */
export function predictStepsMs(
  steps: readonly PlannedStep[],
  axes: readonly AxisSetup[],
  acquisitionMs: number,
  from?: Position,
): number[] {
  let at = from;
  return steps.map(({ target }) => {
    const stepMs = Math.max(0, ...axes.map((axis) => axisMs(axis, at?.[axis.name], target[axis.name])));
    at = target;
    return stepMs + acquisitionMs;
  });
}

/** What is left after `done` steps. */
export function timeLeftMs(stepsMs: readonly number[], done: number): number {
  return stepsMs.slice(done).reduce((sum, ms) => sum + ms, 0);
}

/** Axes move together: the slowest counts. One that stands still needs no settling. */
function axisMs(axis: AxisSetup, fromDeg: number | undefined, toDeg: number | undefined): number {
  if (toDeg === undefined || fromDeg === toDeg) return 0;
  const start = axis.approachFrom === 'below' ? toDeg - axis.approachDeg : toDeg + axis.approachDeg;
  if (fromDeg === undefined) return moveMs(axis, start, toDeg) + axis.settleMs;
  // Already on the side of the approach: no detour.
  if ((toDeg - fromDeg) * (toDeg - start) >= 0) return moveMs(axis, fromDeg, toDeg) + axis.settleMs;
  return moveMs(axis, fromDeg, start) + moveMs(axis, start, toDeg) + axis.settleMs;
}

/**
 * From rest to rest, with the axis's rate v and acceleration a (kinematics of constant acceleration):
 *
 *   long way, d ≥ v²/a:  ╱▔▔▔╲  d/v + v/a        short way:  ╱╲  2·√(d/a)
 */
export function moveMs(
  axis: Pick<AxisSetup, 'rateDegPerS' | 'accelerationDegPerS2'>,
  fromDeg: number,
  toDeg: number,
): number {
  const { rateDegPerS: rate, accelerationDegPerS2: acceleration } = axis;
  const way = Math.abs(toDeg - fromDeg);
  const seconds =
    way >= rate ** 2 / acceleration ? way / rate + rate / acceleration : 2 * Math.sqrt(way / acceleration);
  return seconds * 1000;
}
