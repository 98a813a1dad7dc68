import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { cubicWeights, unwrapDegrees } from '../../../../mocks/scene/interpolation.ts';

const knots = [820, 830, 840, 850, 860, 870];

function interpolate(values: readonly number[], at: number): number {
  const { first, weights } = cubicWeights(knots, at);
  return weights.reduce((sum, weight, j) => sum + weight * values[first + j]!, 0);
}

describe('cubicWeights', () => {
  it('gives back straight lines everywhere, ends included, and parabolas inside', () => {
    fc.assert(
      fc.property(fc.double({ min: 820, max: 870, noNaN: true }), (at) => {
        expect(
          interpolate(
            knots.map((k) => 3 * k - 7),
            at,
          ),
        ).toBeCloseTo(3 * at - 7, 6);
        if (at < 830 || at > 860) return;
        expect(
          interpolate(
            knots.map((k) => (k - 845) ** 2),
            at,
          ),
        ).toBeCloseTo((at - 845) ** 2, 6);
      }),
      { seed: 1 },
    );
  });

  it('hits the knots, has no step in slope there, and holds its ends', () => {
    const values = [1, -2, 5, 4, 0, 9];
    knots.forEach((knot, i) => {
      expect(interpolate(values, knot)).toBeCloseTo(values[i]!, 12);
    });
    for (const knot of knots.slice(1, -1)) {
      const before = (interpolate(values, knot) - interpolate(values, knot - 1e-5)) / 1e-5;
      const behind = (interpolate(values, knot + 1e-5) - interpolate(values, knot)) / 1e-5;
      expect(Math.abs(before - behind)).toBeLessThan(1e-4);
    }
    expect(interpolate(values, 0)).toBe(1);
    expect(interpolate(values, 9000)).toBe(9);
  });
});

describe('unwrapDegrees', () => {
  it('removes whole turns only', () => {
    expect(unwrapDegrees([170, -170, -10, 175, -175])).toEqual([170, 190, 350, 175, 185]);
  });
});
