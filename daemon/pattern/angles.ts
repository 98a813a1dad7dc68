// Angles of a pattern and positions of an axis, and the way from one to the other. Degrees everywhere.
// Knows nothing of travel limits or cable wrap; which whole turn to drive to is the positioner's matter.
import { finite, PatternError } from './pattern-error.ts';

/** How an axis turns into pattern angles: from the range file. */
export interface AngleSense {
  /** +1 when the pattern angle grows with the position, −1 when it falls. */
  sense: 1 | -1;
  /** Position of the axis, in degrees, at which the pattern angle is 0. */
  boresightDeg: number;
}

/**
 * An angle wrapped to (−180°, 180°].
 *
 * @param angleDeg any finite angle in degrees
 * @returns the same direction, above −180 and up to 180 inclusive
 * @throws PatternError for a non-finite angle
 */
export function wrapDeg(angleDeg: number): number {
  const rest = finite('angleDeg', angleDeg) % 360;
  if (rest > 180) return rest - 360;
  if (rest <= -180) return rest + 360;
  return rest + 0;
}

/**
 * Pattern angle of an axis position: sense × (position − boresight), wrapped to (−180°, 180°].
 *
 * @param positionDeg the axis's own coordinate in degrees
 * @param axis sense and boresight of that axis
 * @returns pattern angle in degrees
 * @throws PatternError for non-finite numbers or a sense other than ±1
 */
export function patternAngleDeg(positionDeg: number, axis: AngleSense): number {
  checkSense(axis.sense);
  return wrapDeg(
    axis.sense * (finite('positionDeg', positionDeg) - finite('boresightDeg', axis.boresightDeg)),
  );
}

/**
 * Axis position of a pattern angle, the way back: boresight + sense × angle.
 *
 * The angle is not wrapped first: −180 and +180 are the same direction and two positions, one at each end
 * of a full turn.
 *
 * @param angleDeg pattern angle in degrees
 * @param axis sense and boresight of that axis
 * @returns position in degrees
 * @throws PatternError for non-finite numbers or a sense other than ±1
 */
export function positionDeg(angleDeg: number, axis: AngleSense): number {
  checkSense(axis.sense);
  return finite('boresightDeg', axis.boresightDeg) + axis.sense * finite('angleDeg', angleDeg);
}

/**
 * Angles of one travel in one direction without jumps of a turn: 179, 180, −179 becomes 179, 180, 181.
 *
 * @param anglesDeg N angles in the order of travel, neighbours less than 180° apart
 * @returns N angles, the first unchanged, the others by whole turns
 * @throws PatternError for a non-finite angle
 */
export function unwrapDeg(anglesDeg: ArrayLike<number>): Float64Array {
  const unwrapped = new Float64Array(anglesDeg.length);
  let turnsDeg = 0;
  for (let k = 0; k < unwrapped.length; k += 1) {
    const angleDeg = finite(`anglesDeg[${k}]`, anglesDeg[k]!);
    if (k > 0) {
      const stepDeg = angleDeg - anglesDeg[k - 1]!;
      // A sweep handed in as −180 … 180 has no jump; one of more than half a turn is the wrap.
      if (Math.abs(stepDeg) > 180) turnsDeg -= 360 * Math.round(stepDeg / 360);
    }
    unwrapped[k] = angleDeg + turnsDeg;
  }
  return unwrapped;
}

function checkSense(sense: number): void {
  if (sense === 1 || sense === -1) return;
  throw new PatternError(`The sense of the axis is ${sense}; write 1 or -1.`, { sense });
}
