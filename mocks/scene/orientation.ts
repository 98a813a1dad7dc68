// Directions and turns in space, for the scene alone. Range frame: x from the AUT towards the range
// antenna, z up, y completes the right hand. An antenna's frame: x boresight, z up, azimuth from x towards
// y, elevation from the horizon up.
import type { Pose } from './pose.ts';

export type Vector = readonly [number, number, number];

/** Rows of a rotation: `turn(m, v)` is m·v. */
export type Rotation = readonly [Vector, Vector, Vector];

/**
 * How the AUT's two axes are stacked. `azimuth-over-elevation`: the turntable rides on the tilt, so that a
 * position (azimuth, elevation) is a direction on the sphere. `elevation-over-azimuth`: the tilt rides on
 * the turntable. Both give the principal cuts alike.
 */
export type Stacking = 'azimuth-over-elevation' | 'elevation-over-azimuth';

/** Sine and cosine that are exact at the quarter turns, so that cuts stay on their planes. */
function sineCosine(angleDeg: number): [number, number] {
  const wrapped = angleDeg - 360 * Math.round(angleDeg / 360);
  if (wrapped === 0) return [0, 1];
  if (wrapped === 90) return [1, 0];
  if (wrapped === -90) return [-1, 0];
  if (wrapped === 180 || wrapped === -180) return [0, -1];
  const angle = (wrapped * Math.PI) / 180;
  return [Math.sin(angle), Math.cos(angle)];
}

/** Carries x towards y: adds `angleDeg` to an azimuth. */
export function azimuthTurn(angleDeg: number): Rotation {
  const [s, c] = sineCosine(angleDeg);
  return [
    [c, -s, 0],
    [s, c, 0],
    [0, 0, 1],
  ];
}

/** Carries x towards z: adds `angleDeg` to the elevation of what lies ahead. */
export function elevationTurn(angleDeg: number): Rotation {
  const [s, c] = sineCosine(angleDeg);
  return [
    [c, 0, -s],
    [0, 1, 0],
    [s, 0, c],
  ];
}

/** Carries z towards y: a roll about boresight. */
export function rollTurn(angleDeg: number): Rotation {
  const [s, c] = sineCosine(angleDeg);
  return [
    [1, 0, 0],
    [0, c, s],
    [0, -s, c],
  ];
}

export function turn(m: Rotation, v: Vector): Vector {
  return [dot(m[0], v), dot(m[1], v), dot(m[2], v)];
}

/** First `b`, then `a`. */
export function after(a: Rotation, b: Rotation): Rotation {
  const column = (i: 0 | 1 | 2): Vector => turn(a, [b[0][i], b[1][i], b[2][i]]);
  const [x, y, z] = [column(0), column(1), column(2)];
  return [
    [x[0], y[0], z[0]],
    [x[1], y[1], z[1]],
    [x[2], y[2], z[2]],
  ];
}

export function dot(a: Vector, b: Vector): number {
  return a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
}

/** Azimuth in (−180, 180] and elevation in [−90, 90] of a unit vector, in degrees. */
export function directionOf(v: Vector): { azimuthDeg: number; elevationDeg: number } {
  const level = Math.hypot(v[0], v[1]);
  return {
    azimuthDeg: level === 0 ? 0 : (Math.atan2(v[1], v[0]) * 180) / Math.PI,
    elevationDeg: (Math.atan2(v[2], level) * 180) / Math.PI,
  };
}

/** Unit vectors of growing azimuth and growing elevation at a direction. */
export function tangentsAt(v: Vector): { azimuth: Vector; elevation: Vector } {
  const level = Math.hypot(v[0], v[1]);
  const c = level === 0 ? 1 : v[0] / level;
  const s = level === 0 ? 0 : v[1] / level;
  return { azimuth: [-s, c, 0], elevation: [-v[2] * c, -v[2] * s, level] };
}

/**
 * From the range frame to the mount of the AUT: at azimuth a and elevation e of the axes, the range antenna
 * is seen from the AUT at azimuth a (elevation axis at 0) and at elevation e (azimuth axis at 0).
 */
export function mountTurn(pose: Pose, stacking: Stacking): Rotation {
  const azimuth = azimuthTurn(pose.azimuthDeg);
  const elevation = elevationTurn(pose.elevationDeg);
  return stacking === 'azimuth-over-elevation' ? after(azimuth, elevation) : after(elevation, azimuth);
}
