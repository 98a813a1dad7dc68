// How one straight move spends its length: speed up, cruise, slow down. Pure; the planner says with which
// speeds a move begins and ends, the timeline lays the phases into space and time.
//
//   speed
//   cruise ┤      ┌───────────┐
//          │     ╱             ╲
//    entry ┤    ╱               ╲
//     exit ┤                     ╲
//          └────┴──┴───────────┴──┴── time
//
// Where the length is too short to reach the cruise speed, the two ramps meet at the peak
// √((2·a·length + entry² + exit²) / 2).

/** Constant acceleration: `speed` at the start in units/s, `acceleration` along the path in units/s². */
export interface Phase {
  seconds: number;
  speed: number;
  acceleration: number;
}

/** Phases that cover `length` units, from `entry` to `exit` speed, never faster than `cruise` for long. */
export function phasesOf(
  length: number,
  entry: number,
  cruise: number,
  exit: number,
  acceleration: number,
): Phase[] {
  const meet = Math.sqrt(Math.max(0, (2 * acceleration * length + entry * entry + exit * exit) / 2));
  // Entering faster than the cruise speed happens when an override has just been lowered.
  const top = entry > cruise ? cruise : Math.min(cruise, Math.max(meet, entry, exit));
  const first = ramp(entry, top, acceleration);
  const last = ramp(top, exit, acceleration);
  const between = length - lengthOf(first) - lengthOf(last);
  const phases = [first];
  if (top > 0 && between > 0) phases.push({ seconds: between / top, speed: top, acceleration: 0 });
  phases.push(last);
  return phases.filter((phase) => phase.seconds > 0);
}

/** One ramp between two speeds. */
export function ramp(from: number, to: number, acceleration: number): Phase {
  const seconds = Math.abs(to - from) / acceleration;
  return { seconds, speed: from, acceleration: to >= from ? acceleration : -acceleration };
}

/** Length covered by a phase, in units. */
export function lengthOf(phase: Phase): number {
  return phase.speed * phase.seconds + (phase.acceleration * phase.seconds * phase.seconds) / 2;
}
