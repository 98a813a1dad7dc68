// Whether an axis without a home switch may be believed after its controller was met anew. What makes a count
// doubtful each family knows by itself.
import { DriverError } from '../errors.ts';
import type { AxisSetup, Position } from './positioner.ts';

export interface AxisContinuity {
  isContinuous(axis: AxisSetup, position: Position): boolean;
}

/** Throws POSITIONER_REFERENCE_LOST for an axis whose zero may have moved under it. */
export function demandContinuity(
  axes: readonly AxisSetup[],
  reference: AxisContinuity,
  position: Position,
): void {
  for (const axis of axes) {
    if (axis.homing === 'switch' || reference.isContinuous(axis, position)) continue;
    throw new DriverError(
      'POSITIONER_REFERENCE_LOST',
      `${axis.name} has no homing switch and its zero has moved: set it to zero by hand and connect anew`,
      { axis: axis.name, reportedDeg: position[axis.name] ?? 'unknown' },
    );
  }
}
