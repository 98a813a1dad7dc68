// The instrument's view of a scene: each pass is measured on the simulated range, with the axes where they
// stood at each point's own moment.
import type { PoseAt } from '../scene/pose.ts';
import type { Scene } from '../scene/scene.ts';
import type { Measure } from './measurement.ts';

/** `poseAt` must know the past of one whole sweep, averages included. */
export function measureScene(scene: Scene, poseAt: PoseAt): Measure {
  return (pass) => scene.sweep({ ...pass, poseAt });
}
