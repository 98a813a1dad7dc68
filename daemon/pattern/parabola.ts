// The vertex of the parabola through three points, spaced as they come. Shared by the refinement of peaks,
// lobes and the best-match frequency.

/** Where the parabola turns, in the units of its points. */
export interface Vertex {
  x: number;
  y: number;
}

/**
 * Vertex of the parabola through three points.
 *
 * With the middle point as origin, y = y1 + b·u + a·u²; vertex at u = −b/2a. When the middle point is the
 * highest (or lowest) of the three, the vertex lies within half a step of it for equal steps, and always
 * between the outer two.
 *
 * @param x0 first abscissa; x0 < x1 < x2
 * @param y0 ordinate there
 * @param x1 middle abscissa
 * @param y1 ordinate there
 * @param x2 last abscissa
 * @param y2 ordinate there
 * @returns the vertex, or undefined when the three points lie on a line
 * Source: Lagrange interpolation, closed form. Checked: tests/unit/daemon/pattern/peak.test.ts.
 */
export function parabolaVertex(
  x0: number,
  y0: number,
  x1: number,
  y1: number,
  x2: number,
  y2: number,
): Vertex | undefined {
  const left = x1 - x0;
  const right = x2 - x1;
  const slopeLeft = (y1 - y0) / left;
  const slopeRight = (y2 - y1) / right;
  const a = (slopeRight - slopeLeft) / (left + right);
  if (a === 0) return undefined;
  const b = slopeLeft + a * left;
  const shift = -b / (2 * a);
  if (!(shift > -left && shift < right)) return undefined;
  return { x: x1 + shift, y: y1 + b * shift + a * shift * shift };
}
