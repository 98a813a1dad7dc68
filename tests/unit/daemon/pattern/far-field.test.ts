import { describe, expect, it } from 'vitest';
import { edgePhaseDeg, farFieldDistanceM } from '../../../../daemon/pattern/far-field.ts';
import { speedOfLightMS } from '../../../../daemon/pattern/friis.ts';
import { PatternError } from '../../../../daemon/pattern/pattern-error.ts';

describe('far field', () => {
  it('takes the path to the edge as it is, also where the quadratic term is not enough', () => {
    // A wavelength of 1 m; centre at 1.2 m, edge 0.5 m aside: the path is 1.3 m, a tenth of a turn longer.
    expect(edgePhaseDeg(1, 1.2, speedOfLightMS)).toBeCloseTo(36, 9);
  });

  it('refuses sizes and distances that are none', () => {
    expect(() => farFieldDistanceM(0, 1e9)).toThrow(PatternError);
    expect(() => edgePhaseDeg(1, -1, 1e9)).toThrow(PatternError);
  });
});
