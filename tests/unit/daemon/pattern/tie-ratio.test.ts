import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { PatternError } from '../../../../daemon/pattern/pattern-error.ts';
import { tieRatio } from '../../../../daemon/pattern/tie-ratio.ts';

const frequenciesHz = Float64Array.from({ length: 201 }, (_, k) => 820e6 + k * 0.5e6);

function multiplied(trace: Float64Array, re: number, im: number): Float64Array {
  return trace.map((value, i) =>
    i % 2 === 0 ? value * re - trace[i + 1]! * im : value * re + trace[i - 1]! * im,
  );
}

describe('the ratio of a tie to the first', () => {
  it('is the factor between them where that factor is flat, whatever the trace', () => {
    fc.assert(
      fc.property(
        fc.array(fc.double({ min: -1, max: 1, noNaN: true }), { minLength: 402, maxLength: 402 }),
        fc.double({ min: -2, max: 2, noNaN: true }),
        fc.double({ min: -2, max: 2, noNaN: true }),
        (values, re, im) => {
          const first = Float64Array.from(values, (value) => value + 0.001);
          const ratio = tieRatio(frequenciesHz, first, multiplied(first, re, im));
          for (let i = 0; i < ratio.length; i += 2) {
            expect(ratio[i]).toBeCloseTo(re, 9);
            expect(ratio[i + 1]).toBeCloseTo(im, 9);
          }
        },
      ),
      { numRuns: 30 },
    );
  });

  it('is quieter in a null than the frequency itself', () => {
    const first = Float64Array.from({ length: 402 }, (_, i) => (i % 2 === 0 ? 0.01 : 0));
    first[200] = 1e-6; // boresight in a null at one frequency
    const noise = (i: number): number => 1e-5 * Math.sin(12.9898 * i);
    const tie = first.map((value, i) => value + noise(i));
    const ratio = tieRatio(frequenciesHz, first, tie);
    expect(Math.abs(ratio[200]! - 1)).toBeLessThan(1e-3);
    expect(Math.abs(tie[200]! / first[200]! - 1)).toBeGreaterThan(1);
  });

  it('follows a delay drift over the band within the stated 0.002 dB and half a degree', () => {
    const first = Float64Array.from({ length: 402 }, (_, i) => (i % 2 === 0 ? 1 : 0));
    const turnDeg = (k: number): number => 60 * (frequenciesHz[k]! / 868e6);
    const tie = first.map((_, i) => {
      const angle = (turnDeg(i >> 1) * Math.PI) / 180;
      return i % 2 === 0 ? Math.cos(angle) : Math.sin(angle);
    });
    const ratio = tieRatio(frequenciesHz, first, tie);
    for (let k = 0; k < 201; k += 1) {
      const level = 20 * Math.log10(Math.hypot(ratio[2 * k]!, ratio[2 * k + 1]!));
      expect(Math.abs(level)).toBeLessThan(0.002);
      const deg = (Math.atan2(ratio[2 * k + 1]!, ratio[2 * k]!) * 180) / Math.PI;
      // One-sided windows at the ends of the band lean inward by half the window.
      expect(Math.abs(deg - turnDeg(k))).toBeLessThan(0.8);
    }
  });

  it('refuses ties of another grid', () => {
    expect(() => tieRatio(frequenciesHz, new Float64Array(4), new Float64Array(4))).toThrow(PatternError);
  });
});
