import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { parabolaVertex } from '../../../../daemon/pattern/parabola.ts';
import { peakOf } from '../../../../daemon/pattern/peak.ts';
import { byHand, parabola, part, turn } from './cut-samples.ts';

describe('the parabola through three points', () => {
  it('finds the vertex of any parabola from uneven points', () => {
    fc.assert(
      fc.property(
        fc.double({ min: -5, max: -0.1, noNaN: true }),
        fc.double({ min: -0.4, max: 0.4, noNaN: true }),
        fc.double({ min: 0.5, max: 3, noNaN: true }),
        fc.double({ min: 0.5, max: 3, noNaN: true }),
        (bend, vertexX, left, right) => {
          const y = (x: number) => 2 + bend * (x - vertexX) ** 2;
          const found = parabolaVertex(-left, y(-left), 0, y(0), right, y(right));
          expect(found!.x).toBeCloseTo(vertexX, 8);
          expect(found!.y).toBeCloseTo(2, 8);
        },
      ),
    );
  });

  it('has none for a line', () => {
    expect(parabolaVertex(0, 0, 1, 1, 2, 2)).toBeUndefined();
  });
});

describe('the peak of a cut', () => {
  it('lies between uneven samples where the lobe has its top', () => {
    const lobe = parabola(30, 3.3, 9.5);
    const anglesDeg = [-20, -9, -4, 2, 5, 11, 19];
    const peak = peakOf(byHand(anglesDeg, anglesDeg.map(lobe)));
    expect(peak.angleDeg).toBeCloseTo(3.3, 9);
    expect(peak.levelDb).toBeCloseTo(9.5, 9);
    expect(peak).toMatchObject({ index: 3, refined: true, flat: false });
  });

  it('wraps round a full turn', () => {
    const peak = peakOf(turn((deg) => Math.max(-40, parabola(50, 180.2)(deg < 0 ? deg + 360 : deg))));
    expect(peak.angleDeg).toBeCloseTo(-179.8, 9);
    const other = peakOf(turn((deg) => Math.max(-40, parabola(50, 179.7)(deg < 0 ? deg + 360 : deg))));
    expect(other.angleDeg).toBeCloseTo(179.7, 9);
    const first = peakOf({
      ...turn((deg) => Math.max(-40, parabola(50, -179.2)(deg > 0 ? deg - 360 : deg))),
    });
    expect(first.angleDeg).toBeCloseTo(-179.2, 9);
  });

  it('stands as sampled at the edge of a part of a turn, and says so', () => {
    const peak = peakOf(part(parabola(60, -40), -30, 30));
    expect(peak).toMatchObject({ angleDeg: -30, refined: false, because: 'it lies at the edge of the cut' });
  });

  it('takes the middle of several equal samples', () => {
    const peak = peakOf(byHand([0, 1, 2, 3, 4, 5, 6], [-9, 0, 0, 0, 0, 0, -9]));
    expect(peak).toMatchObject({ angleDeg: 3, levelDb: 0, refined: false });
    expect(peak.because).toContain('5 neighbours');
  });

  it('finds the middle across the seam of a full turn', () => {
    const levels = [0, 0, -5, -5, -5, -5, -5, 0];
    const peak = peakOf(byHand([-135, -90, -45, 0, 45, 90, 135, 180], levels, true));
    expect(peak.angleDeg).toBe(-135);
  });

  it('places a top between two equal samples', () => {
    const peak = peakOf(byHand([0, 1, 2, 3], [-4, 0, 0, -4]));
    expect(peak.angleDeg).toBeCloseTo(1.5, 12);
  });

  it('does not lift a jump', () => {
    const peak = peakOf(byHand([0, 1, 2, 3], [-100, 0, -0.001, -50]));
    expect(peak).toMatchObject({
      levelDb: 0,
      refined: false,
      because: expect.stringContaining('too far apart'),
    });
  });

  it('is flat where no direction is stronger', () => {
    expect(peakOf(turn(() => 2))).toMatchObject({ flat: true, levelDb: 2 });
    expect(peakOf(turn((deg) => (deg === 7 ? 2.001 : 2)))).toMatchObject({ flat: false, index: 186 });
  });
});
