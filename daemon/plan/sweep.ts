// One cut as coordinates of its swept axis. Pure. A cut is swept in one piece and in the direction of the
// axis's approach, so that every step already comes from the backlash side and the cable winds once:
//
//   approachFrom below:   travelMin ├──── approach ▸ first ▸ ▸ ▸ ▸ ▸ ▸ last ────┤ travelMax
//
// Where that does not fit, the same directions are sought a number of turns away; a full turn may also
// begin at any other of its directions.

import type { PlanCut } from '../files/plan-file.ts';
import type { RangeAxis } from '../files/range-file.ts';

export interface SweepPoint {
  angleDeg: number;
  positionDeg: number;
}

export type Sweep =
  | { kind: 'sweep'; points: readonly SweepPoint[] }
  | { kind: 'absent'; at: SweepPoint; outsideDeg: number };

/** Travel is compared with this slack, far below any controller's resolution. */
const slackDeg = 1e-9;

/** True for a cut whose last direction is its first again. */
export function isFullTurn(cut: PlanCut): boolean {
  return Math.abs(cut.toDeg - cut.fromDeg - 360) < 1e-6;
}

/**
 * The points of a cut in the order of the sweep, approach of the first included in travel. When it cannot
 * be, `absent` with the point that lies outside as the plan has it and the coordinate that would be
 * needed: its own or that of its approach.
 */
export function sweepOf(cut: PlanCut, axis: RangeAxis): Sweep {
  const asPlanned = pointsAsPlanned(cut, axis);
  const fits = (points: readonly SweepPoint[]): boolean => firstOutside(points, axis) === undefined;
  for (const points of candidates(asPlanned, cut, axis)) {
    if (fits(points)) return { kind: 'sweep', points };
  }
  return { kind: 'absent', ...firstOutside(asPlanned, axis)! };
}

/** The coordinate for a pattern angle, a number of turns away where needed; undefined when none is in travel. */
export function positionFor(angleDeg: number, axis: RangeAxis): number | undefined {
  const point = { angleDeg, positionDeg: directPosition(angleDeg, axis) };
  for (const turns of nearestFirst(turnsAcross(axis))) {
    const moved = shifted([point], turns);
    if (firstOutside(moved, axis) === undefined) return moved[0]!.positionDeg;
  }
  return undefined;
}

/** The inverse of pattern angle = sense × (position − boresight), without wrapping. */
export function directPosition(angleDeg: number, axis: RangeAxis): number {
  return tidy(axis.boresightDeg + axis.sense * angleDeg);
}

/** The coordinate from which the last stretch to a position begins. */
export function approachStart(positionDeg: number, axis: RangeAxis): number {
  return tidy(
    axis.approachFrom === 'below' ? positionDeg - axis.approachDeg : positionDeg + axis.approachDeg,
  );
}

function pointsAsPlanned(cut: PlanCut, axis: RangeAxis): SweepPoint[] {
  const span = cut.toDeg - cut.fromDeg;
  const steps = Math.round(span / cut.stepDeg);
  const points = Array.from({ length: steps + 1 }, (_, i) => {
    const angleDeg = tidy(cut.fromDeg + (span * i) / steps);
    return { angleDeg, positionDeg: directPosition(angleDeg, axis) };
  });
  const rising = axis.sense === 1;
  return rising === (axis.approachFrom === 'below') ? points : points.reverse();
}

/** The plan's own points first, then those nearest to them. */
function* candidates(points: SweepPoint[], cut: PlanCut, axis: RangeAxis): Generator<SweepPoint[]> {
  if (!isFullTurn(cut)) {
    for (const turns of nearestFirst(turnsAcross(axis))) yield shifted(points, turns);
    return;
  }
  const steps = points.length - 1;
  for (const start of nearestFirst(turnsAcross(axis) * steps)) yield begunAt(points, start);
}

/** A full turn begun `start` steps later (earlier when negative), one direction after the other. */
function begunAt(points: SweepPoint[], start: number): SweepPoint[] {
  if (start === 0) return points;
  const steps = points.length - 1;
  const turn = Math.sign(points[steps]!.positionDeg - points[0]!.positionDeg) * 360;
  return Array.from({ length: steps + 1 }, (_, i) => {
    const turns = Math.floor((start + i) / steps);
    const { angleDeg, positionDeg } = points[start + i - turns * steps]!;
    return { angleDeg, positionDeg: tidy(positionDeg + turns * turn) };
  });
}

function shifted(points: SweepPoint[], turns: number): SweepPoint[] {
  return points.map(({ angleDeg, positionDeg }) => ({
    angleDeg,
    positionDeg: tidy(positionDeg + 360 * turns),
  }));
}

/** More turns than any equivalent inside travel can be away. */
function turnsAcross(axis: RangeAxis): number {
  return Math.ceil((axis.travelMaxDeg - axis.travelMinDeg) / 360) + 2;
}

function* nearestFirst(farthest: number): Generator<number> {
  yield 0;
  for (let away = 1; away <= farthest; away += 1) {
    yield away;
    yield -away;
  }
}

/** The first point outside travel, the approach of the first one counted as its own. */
function firstOutside(
  points: readonly SweepPoint[],
  axis: RangeAxis,
): { at: SweepPoint; outsideDeg: number } | undefined {
  const outside = (deg: number): boolean =>
    deg < axis.travelMinDeg - slackDeg || deg > axis.travelMaxDeg + slackDeg;
  const first = points[0]!;
  const last = points.at(-1)!;
  if (outside(first.positionDeg)) return { at: first, outsideDeg: first.positionDeg };
  const start = approachStart(first.positionDeg, axis);
  if (outside(start)) return { at: first, outsideDeg: start };
  // Positions are monotonic: when both ends are inside, all are.
  return outside(last.positionDeg) ? { at: last, outsideDeg: last.positionDeg } : undefined;
}

/** Drops the last binary digits that sums leave behind; 1e-9° is no angle anybody can set. */
function tidy(deg: number): number {
  return Math.round(deg * 1e9) / 1e9 + 0;
}
