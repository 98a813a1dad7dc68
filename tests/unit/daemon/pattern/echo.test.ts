// Geometry by hand: 3 m over ground and 4 m apart is the 3-4-5 triangle seen twice, so the reflected way is
// √(4² + 6²) = √52 m.
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { excessPathM, rippleDb, strongestEchoDb, waysM } from '../../../../daemon/pattern/echo.ts';
import { PatternError } from '../../../../daemon/pattern/pattern-error.ts';

describe('a second way by reflection', () => {
  it('is as long as the straight one to the mirror image', () => {
    // 8 m along, 2 and 4 m up: direct √(64 + 4), reflected √(64 + 36) = 10.
    expect(waysM({ alongM: 8, firstM: 2, secondM: 4 })).toEqual({ directM: Math.sqrt(68), reflectedM: 10 });
    expect(excessPathM({ alongM: 8, firstM: 2, secondM: 4 })).toBeCloseTo(10 - Math.sqrt(68), 12);
    expect(excessPathM({ alongM: 4, firstM: 3, secondM: 3 })).toBeCloseTo(Math.sqrt(52) - 4, 12);
  });

  it('keeps its digits at grazing incidence: 2ab/R', () => {
    const excess = excessPathM({ alongM: 1e6, firstM: 0.01, secondM: 0.02 });
    expect(excess / ((2 * 0.01 * 0.02) / 1e6)).toBeCloseTo(1, 9);
  });

  it('is weaker by the ratio of the ways, and no more', () => {
    // 6 m apart and 4 m up: 10 m against 6 m, 20 log 0.6 = −4.437 dB.
    expect(strongestEchoDb({ alongM: 6, firstM: 4, secondM: 4 })).toBeCloseTo(-4.43697, 4);
  });

  it('agrees with the difference of both ways anywhere', () => {
    const metres = fc.double({ min: 0.1, max: 100, noNaN: true });
    fc.assert(
      fc.property(metres, metres, metres, (alongM, firstM, secondM) => {
        const { directM, reflectedM } = waysM({ alongM, firstM, secondM });
        expect(excessPathM({ alongM, firstM, secondM })).toBeCloseTo(reflectedM - directM, 9);
      }),
    );
  });

  it('refuses an echo as strong as the wanted wave, and lengths that are none', () => {
    expect(() => rippleDb(0)).toThrow(PatternError);
    expect(() => excessPathM({ alongM: 1, firstM: 0, secondM: 1 })).toThrow(PatternError);
  });
});
