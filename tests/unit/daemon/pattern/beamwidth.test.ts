import { describe, expect, it } from 'vitest';
import { beamwidth, narrowReadingDeg } from '../../../../daemon/pattern/beamwidth.ts';
import { PatternError } from '../../../../daemon/pattern/pattern-error.ts';
import { peakOf } from '../../../../daemon/pattern/peak.ts';
import { byHand, parabola, part, turn } from './cut-samples.ts';

describe('beamwidth', () => {
  it('is linear in dB between samples, on each side by itself', () => {
    const cut = byHand([-20, -10, 0, 10, 20], [-9, -3, 0, -1, -7]);
    const width = beamwidth(cut, { ...peakOf(cut), levelDb: 0 }, { dropDb: 4 });
    // Left: from −3 at −10 to −9 at −20, −4 a sixth of the way; right: from −1 at 10 to −7 at 20, half way.
    expect(width).toMatchObject({ kind: 'value', rightDeg: 15 });
    if (width.kind !== 'value') return;
    expect(width.leftDeg).toBeCloseTo(-10 - 10 / 6, 12);
    expect(width.value).toBeCloseTo(25 + 10 / 6, 12);
    expect(width.middleDeg).toBeCloseTo((15 - 10 - 10 / 6) / 2, 12);
  });

  it('takes the first crossing, not a later one', () => {
    const cut = byHand([-4, -3, -2, -1, 0, 1, 2, 3, 4], [0.5 - 9, -1, -6, -2, 0, -2, -6, -1, -9]);
    const width = beamwidth(cut, { ...peakOf(cut), levelDb: 0 }, { dropDb: 4 });
    expect(width).toMatchObject({ leftDeg: -1.5, rightDeg: 1.5 });
  });

  it('counts a sample that lies on the threshold', () => {
    const cut = byHand([-2, -1, 0, 1, 2], [-8, -4, 0, -4, -8]);
    expect(beamwidth(cut, { ...peakOf(cut), levelDb: 0 }, { dropDb: 4 })).toMatchObject({ value: 2 });
    // It has fallen 4 dB there, also when it rises again.
    const touching = byHand([-3, -2, -1, 0, 1, 2, 3], [-9, -2, -4, 0, -4, -1, -9]);
    expect(beamwidth(touching, { ...peakOf(touching), levelDb: 0 }, { dropDb: 4 })).toMatchObject({
      value: 2,
    });
  });

  it('counts from the refined peak', () => {
    const cut = part(parabola(40, 2.5), -60, 60, 5);
    const peak = peakOf(cut);
    const refined = beamwidth(cut, peak);
    const sampled = beamwidth(cut, peak, { referenceDb: cut.levelDb[peak.index]! });
    if (refined.kind !== 'value' || sampled.kind !== 'value') throw new Error('no beamwidth');
    expect(Math.abs(refined.value - 40)).toBeLessThan(0.32);
    expect(sampled.value - refined.value).toBeGreaterThan(0.2);
  });

  it('runs across the seam of a full turn', () => {
    const width = beamwidth(
      ...withPeak(turn((deg) => Math.max(-40, parabola(50, 170)(deg < 0 ? deg + 360 : deg)))),
    );
    expect(width).toMatchObject({ kind: 'value' });
    if (width.kind !== 'value') return;
    expect(width.leftDeg).toBeCloseTo(145, 1);
    expect(width.rightDeg).toBeCloseTo(-165, 1);
    expect(width.middleDeg).toBeCloseTo(170, 6);
  });

  it('says which side does not fall, or that none does', () => {
    const because = (fromDeg: number, toDeg: number) => {
      const width = beamwidth(...withPeak(part(parabola(60), fromDeg, toDeg)));
      return width.kind === 'absent' ? width.because : width.value;
    };
    expect(because(-10, 80)).toBe('does not fall 3 dB on the left side: the cut ends at -10°');
    expect(because(-80, 12)).toBe('does not fall 3 dB on the right side: the cut ends at 12°');
    expect(because(-10, 10)).toBe('does not fall 3 dB on either side of the peak');
    expect(because(-40, 40)).toBeCloseTo(60, 1);
  });

  it('is absent for an omnidirectional cut', () => {
    const cut = turn((deg) => Math.cos((deg * Math.PI) / 180));
    expect(beamwidth(...withPeak(cut))).toEqual({
      kind: 'absent',
      because: 'omnidirectional: does not fall 3 dB in any direction',
    });
    expect(beamwidth(...withPeak(cut), { dropDb: 1 }).kind).toBe('value');
  });

  it('refuses a drop that is none', () => {
    const [cut, peak] = withPeak(turn(parabola(60)));
    expect(() => beamwidth(cut, peak, { dropDb: 0 })).toThrow(PatternError);
    expect(() => beamwidth(cut, peak, { dropDb: Number.NaN })).toThrow(PatternError);
  });
});

function withPeak(cut: ReturnType<typeof turn>): [typeof cut, ReturnType<typeof peakOf>] {
  return [cut, peakOf(cut)];
}

describe('how much narrow a beamwidth reads', () => {
  it('is never more than stated, and up to it, for lobes that are parabolas in dB', () => {
    for (const widthDeg of [6.3, 17.6, 49]) {
      for (const stepDeg of [0.5, 1, 2]) {
        const stated = narrowReadingDeg(widthDeg, stepDeg);
        let [most, least] = [0, Number.POSITIVE_INFINITY];
        // The top and the width at all places between the samples.
        for (let at = 0; at < 1; at += 0.04) {
          for (let wide = 0; wide < 1; wide += 0.04) {
            const [topDeg, width] = [at * stepDeg, widthDeg + wide * stepDeg];
            const cut = turn((deg) => Math.max(-40, parabola(width, topDeg)(deg)), stepDeg);
            const found = beamwidth(cut, peakOf(cut));
            if (found.kind !== 'value') throw new Error(found.because);
            most = Math.max(most, width - found.value);
            least = Math.min(least, width - found.value);
          }
        }
        const what = `${widthDeg}° at ${stepDeg}°`;
        expect(least, what).toBeGreaterThan(-1e-9);
        // To second order: the slope changes by a share of step/width on the way to the next sample.
        expect(most / stated, what).toBeLessThan(1 + stepDeg / widthDeg);
        expect(most / stated, what).toBeGreaterThan(0.9 - stepDeg / widthDeg);
      }
    }
  });

  it('is 0.35 % at a twelfth of the width', () => {
    expect(narrowReadingDeg(12, 1) / 12).toBeCloseTo(1 / 288, 12);
    expect(() => narrowReadingDeg(0, 1)).toThrow(PatternError);
  });
});
