import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { impedance, mismatchLossDb, returnLossDb, vswr } from '../../../../daemon/pattern/match.ts';
import { bestMatch, matchedBand, type Reflection, resonance } from '../../../../daemon/pattern/match-band.ts';
import { PatternError } from '../../../../daemon/pattern/pattern-error.ts';

/** S11 of impedances on a grid of MHz, by Γ = (Z − Z0)/(Z + Z0). */
function reflection(mhz: number[], ohm: (mhz: number) => [number, number], z0 = 50): Reflection {
  const s11 = mhz.flatMap((f) => {
    const [r, x] = ohm(f);
    const size = (r + z0) ** 2 + x * x;
    return [(r * r - z0 * z0 + x * x) / size, (2 * z0 * x) / size];
  });
  return { frequenciesHz: Float64Array.from(mhz, (f) => f * 1e6), s11: Float64Array.from(s11) };
}
const grid = (from: number, to: number, step: number) =>
  Array.from({ length: Math.round((to - from) / step) + 1 }, (_, k) => from + k * step);
const value = (figure: { kind: string; value?: number }) =>
  figure.kind === 'value' ? figure.value : figure.kind;

describe('match at one frequency', () => {
  it('turns S11 back into the impedance it came from', () => {
    fc.assert(
      fc.property(
        fc.double({ min: 0.1, max: 2000, noNaN: true }),
        fc.double({ min: -2000, max: 2000, noNaN: true }),
        fc.constantFrom(50, 75, 300),
        (r, x, z0) => {
          const { s11 } = reflection([1], () => [r, x], z0);
          const z = impedance(s11[0]!, s11[1]!, z0);
          expect(z.kind).toBe('value');
          if (z.kind !== 'value') return;
          expect(Math.abs(z.resistanceOhm - r)).toBeLessThan(1e-6 * (1 + r + Math.abs(x)));
          expect(Math.abs(z.reactanceOhm - x)).toBeLessThan(1e-6 * (1 + r + Math.abs(x)));
        },
      ),
    );
  });

  it('has no impedance at an open circuit and none of the others at total reflection', () => {
    expect(impedance(1, 0).kind).toBe('absent');
    expect(impedance(-1, 0)).toEqual({ kind: 'value', resistanceOhm: 0, reactanceOhm: 0 });
    for (const gamma of [1, 1.2]) {
      expect(vswr(gamma).kind).toBe('absent');
      expect(mismatchLossDb(gamma).kind).toBe('absent');
    }
    // More than all comes back: a negative return loss, as measured.
    expect(value(returnLossDb(1.2))).toBeCloseTo(-1.5836, 4);
  });

  it('bounds the return loss of a perfect match', () => {
    expect(returnLossDb(0)).toEqual({ kind: 'bound', bound: 'lower', value: 120 });
    expect(vswr(0)).toEqual({ kind: 'value', value: 1 });
  });

  it('bounds what is within 3 dB of the noise by that mark', () => {
    // Noise 80 dB down, the mark 77 dB down: |Γ| = 10^(−77/20) = 1.41254e-4, VSWR (1 + |Γ|)/(1 − |Γ|).
    for (const gamma of [0, 1e-5, 1.4e-4]) {
      const loss = returnLossDb(gamma, 1e-4);
      expect(loss).toMatchObject({ kind: 'bound', bound: 'lower', note: expect.stringContaining('noise') });
      if (loss.kind === 'bound') expect(loss.value).toBeCloseTo(77, 9);
      const ratio = vswr(gamma, 1e-4);
      expect(ratio).toMatchObject({ kind: 'bound', bound: 'upper', note: expect.stringContaining('noise') });
      if (ratio.kind === 'bound') expect(ratio.value).toBeCloseTo(1.000282548, 8);
    }
    expect(returnLossDb(1.42e-4, 1e-4).kind).toBe('value');
    expect(vswr(1.42e-4, 1e-4).kind).toBe('value');
    // No noise to speak of: 120 dB remain the limit.
    expect(returnLossDb(0, 1e-9)).toEqual({ kind: 'bound', bound: 'lower', value: 120 });
    expect(vswr(0.9, 0.9)).toMatchObject({ kind: 'absent' });
    expect(() => returnLossDb(0.1, -1)).toThrow(PatternError);
  });

  it('refuses magnitudes that are none', () => {
    for (const figure of [returnLossDb, vswr, mismatchLossDb]) {
      expect(() => figure(-0.1)).toThrow(PatternError);
      expect(() => figure(Number.NaN)).toThrow(PatternError);
    }
    expect(() => impedance(0, 0, 0)).toThrow(PatternError);
  });
});

describe('match over a band', () => {
  // A series circuit: resistance rising slowly, X = 0 at 861.3 MHz.
  const circuit = reflection(grid(800, 920, 5), (f) => [60 + (f - 860) / 4, (f - 861.3) * 0.9]);

  it('finds resonance where X is zero, to the accuracy of a straight line', () => {
    expect(value(resonance(circuit))).toBeCloseTo(861.3e6, -3);
  });

  it('finds the best match between samples', () => {
    const fine = reflection(grid(800, 920, 0.01), (f) => [60 + (f - 860) / 4, (f - 861.3) * 0.9]);
    const exact = bestMatch(fine).frequencyHz;
    const coarse = bestMatch(circuit).frequencyHz;
    expect(Math.abs((value(coarse) as number) - (value(exact) as number))).toBeLessThan(0.1e6);
    expect(value(coarse) as number).toBeLessThan(861e6);
  });

  it('takes the resonance next to the best match when there are several', () => {
    // X = 0 at 820, 860 and 900 MHz; matched near 900.
    const many = reflection(grid(801, 920, 3), (f) => [
      f > 880 ? 50 : 300,
      (f - 820) * (f - 860) * (f - 900) * 1e-3,
    ]);
    expect(value(resonance(many))).toBeCloseTo(900e6, -5);
  });

  it('says what keeps it from resonance', () => {
    const long = reflection(grid(800, 920, 10), (f) => [50, 20 + (f - 800) / 10]);
    const short = reflection(grid(800, 920, 10), (f) => [50, -60 + (f - 800) / 10]);
    expect(resonance(long)).toMatchObject({ because: expect.stringContaining('inductive') });
    expect(resonance(short)).toMatchObject({ because: expect.stringContaining('capacitive') });
  });

  it('bounds a best match at the edge of the band', () => {
    const rising = reflection(grid(800, 920, 10), (f) => [50, (f - 700) / 4]);
    expect(bestMatch(rising).frequencyHz).toMatchObject({ kind: 'bound', bound: 'upper', value: 800e6 });
    const falling = reflection(grid(800, 920, 10), (f) => [50, (1000 - f) / 4]);
    expect(bestMatch(falling).frequencyHz).toMatchObject({ kind: 'bound', bound: 'lower', value: 920e6 });
  });

  it('measures the band of a VSWR limit', () => {
    // R = Z0: |Γ| = |X|/√(X² + 4 Z0²) is 1/3 at |X| = Z0/√2, 39.28 MHz from resonance at 0.9 Ω per MHz.
    const matched = reflection(grid(700, 1000, 1), (f) => [50, (f - 860) * 0.9]);
    const band = matchedBand(matched, 2);
    const halfHz = (50 / Math.SQRT2 / 0.9) * 1e6;
    expect(value(band.startHz)).toBeCloseTo(860e6 - halfHz, -4);
    expect(value(band.stopHz)).toBeCloseTo(860e6 + halfHz, -4);
    expect(value(band.widthHz)).toBeCloseTo(2 * halfHz, -4);
  });

  it('has no band where the limit is never kept, and half a band where the sweep ends', () => {
    const poor = reflection(grid(800, 920, 10), () => [300, 0]);
    expect(matchedBand(poor, 2).widthHz).toMatchObject({ kind: 'absent' });
    const matched = reflection(grid(850, 1000, 1), (f) => [50, (f - 860) * 0.9]);
    expect(matchedBand(matched, 2)).toMatchObject({
      startHz: { kind: 'bound', bound: 'upper', value: 850e6 },
      stopHz: { kind: 'value' },
      widthHz: { kind: 'bound', bound: 'lower' },
    });
    expect(() => matchedBand(poor, 1)).toThrow(PatternError);
  });

  it('refuses frequencies out of order and numbers that are none', () => {
    const turned = { frequenciesHz: Float64Array.of(2, 1), s11: new Float64Array(4) };
    expect(() => bestMatch(turned)).toThrow(/out of order/);
    expect(() => bestMatch({ frequenciesHz: Float64Array.of(1, 2), s11: new Float64Array(2) })).toThrow(
      PatternError,
    );
    expect(() =>
      resonance({ frequenciesHz: Float64Array.of(1), s11: Float64Array.of(Number.NaN, 0) }),
    ).toThrow(PatternError);
  });
});
