import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { patternAngleDeg, positionDeg, unwrapDeg, wrapDeg } from '../../../../daemon/pattern/angles.ts';
import { PatternError } from '../../../../daemon/pattern/pattern-error.ts';

describe('wrapping', () => {
  it.each([
    [0, 0],
    [180, 180],
    [-180, 180],
    [181, -179],
    [-181, 179],
    [540, 180],
    [-540, 180],
    [720, 0],
    [-360, 0],
  ])('wraps %d° to %d°', (angleDeg, expected) => {
    expect(wrapDeg(angleDeg)).toBe(expected);
  });

  it('stays above −180, up to 180, in the same direction', () => {
    fc.assert(
      fc.property(fc.double({ min: -1e6, max: 1e6, noNaN: true }), (angleDeg) => {
        const wrapped = wrapDeg(angleDeg);
        expect(wrapped).toBeGreaterThan(-180);
        expect(wrapped).toBeLessThanOrEqual(180);
        expect(Math.abs(Math.sin(((wrapped - angleDeg) * Math.PI) / 360))).toBeLessThan(1e-9);
      }),
    );
  });

  it('refuses what is no angle', () => {
    expect(() => wrapDeg(Number.NaN)).toThrow(PatternError);
    expect(() => wrapDeg(Number.POSITIVE_INFINITY)).toThrow(/finite/);
  });
});

describe('pattern angle and position', () => {
  it('is sense × (position − boresight)', () => {
    expect(patternAngleDeg(100, { sense: 1, boresightDeg: 90 })).toBe(10);
    expect(patternAngleDeg(100, { sense: -1, boresightDeg: 90 })).toBe(-10);
    expect(patternAngleDeg(350, { sense: 1, boresightDeg: 10 })).toBe(-20);
  });

  it('keeps the two ends of a full turn apart on the way back', () => {
    const axis = { sense: -1, boresightDeg: 5 } as const;
    expect(positionDeg(-180, axis)).toBe(185);
    expect(positionDeg(180, axis)).toBe(-175);
  });

  it('comes back to the same direction', () => {
    fc.assert(
      fc.property(
        fc.integer({ min: -179, max: 180 }),
        fc.constantFrom(1 as const, -1 as const),
        fc.integer({ min: -360, max: 360 }),
        (angleDeg, sense, boresightDeg) => {
          const axis = { sense, boresightDeg };
          expect(patternAngleDeg(positionDeg(angleDeg, axis), axis)).toBe(angleDeg);
        },
      ),
    );
  });

  it('refuses a sense other than one', () => {
    expect(() => patternAngleDeg(0, { sense: 0 as 1, boresightDeg: 0 })).toThrow(/write 1 or -1/);
    expect(() => positionDeg(0, { sense: 2 as 1, boresightDeg: 0 })).toThrow(PatternError);
  });
});

describe('unwrapping', () => {
  it('removes jumps of a turn in both directions and leaves a plain sweep alone', () => {
    expect([...unwrapDeg([178, 179, 180, -179, -178])]).toEqual([178, 179, 180, 181, 182]);
    expect([...unwrapDeg([-179, 180, 179])]).toEqual([-179, -180, -181]);
    expect([...unwrapDeg([-180, 0, 180])]).toEqual([-180, 0, 180]);
  });
});
