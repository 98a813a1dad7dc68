import { describe, expect, it } from 'vitest';
import { beamwidth } from '../../../../daemon/pattern/beamwidth.ts';
import { peakOf } from '../../../../daemon/pattern/peak.ts';
import { squint } from '../../../../daemon/pattern/squint.ts';
import { beamAsymmetryDb } from '../../../../daemon/pattern/symmetry.ts';
import { byHand, parabola, turn } from './cut-samples.ts';

describe('squint', () => {
  it('is the middle of the half-power points, whatever noise does to the top', () => {
    const lobe = turn((deg) => Math.max(-40, parabola(60, -4)(deg)) + (deg === 3 ? 0.3 : 0));
    const peak = peakOf(lobe);
    expect(Math.abs(peak.angleDeg - 3)).toBeLessThan(0.5);
    const found = squint(beamwidth(lobe, peak, { referenceDb: 0 }));
    expect(found.kind === 'value' && found.value).toBeCloseTo(-4, 6);
  });

  it('wraps: a beam at 179° is 2° from a boresight at −179°', () => {
    const lobe = turn((deg) => Math.max(-40, parabola(60, 179)(deg < -1 ? deg + 360 : deg)));
    const found = squint(beamwidth(lobe, peakOf(lobe)), -179);
    expect(found.kind === 'value' && found.value).toBeCloseTo(-2, 6);
  });
});

describe('squint without a beam', () => {
  it('is absent, with the reason', () => {
    const circle = turn((deg) => Math.cos((deg * Math.PI) / 180) / 100);
    expect(squint(beamwidth(circle, peakOf(circle)))).toMatchObject({
      kind: 'absent',
      because: expect.stringContaining('omnidirectional'),
    });
  });
});

describe('beam asymmetry', () => {
  it('is none for a symmetrical beam off boresight', () => {
    const lobe = turn((deg) => Math.max(-40, parabola(60, 12)(deg)));
    const found = beamAsymmetryDb(lobe, beamwidth(lobe, peakOf(lobe)));
    expect(found.kind === 'value' && found.value).toBeLessThan(1e-6);
  });

  it('is the difference at equal angles from the axis', () => {
    // Crossings of −4 dB at ±2; at ±1 the levels are −1 and −2.5.
    const cut = byHand([-3, -2, -1, 0, 1, 2, 3], [-8, -4, -1, 0, -2.5, -4, -8]);
    const found = beamAsymmetryDb(cut, beamwidth(cut, { ...peakOf(cut), levelDb: 0 }, { dropDb: 4 }));
    expect(found.kind === 'value' && found.value).toBeCloseTo(1.5, 12);
  });

  it('is absent without a beam', () => {
    const circle = turn(() => 0);
    expect(beamAsymmetryDb(circle, beamwidth(circle, peakOf(circle))).kind).toBe('absent');
  });
});
