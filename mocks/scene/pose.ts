// Where the simulated axes truly stand: the controller knows it, the scene asks for it.

/** True shaft angles in degrees; roll is that of the range antenna about the line of sight. */
export interface Pose {
  azimuthDeg: number;
  elevationDeg: number;
  rollDeg: number;
}

/** The pose at a moment of the bench's clock (Clock.monotonicMs()), in motion or at rest. */
export type PoseAt = (monotonicMs: number) => Pose;
