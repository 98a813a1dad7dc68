// The noise of a mean reflection, and what it leaves of the match of antennas that reflect nothing.
import { describe, expect, it } from 'vitest';
import { bestMatch, type Reflection, resonance } from '../../../../daemon/pattern/match-band.ts';
import { meanNoise } from '../../../../daemon/pattern/mean-noise.ts';
import { gaussian } from './seeded-noise.ts';

const count = 201;
const frequenciesHz = Float64Array.from({ length: count }, (_, k) => 820e6 + k * 0.5e6);
/** 80 dB below a full reflection. */
const oneVisit = 1e-4;

type Signal = (k: number) => [re: number, im: number];

/** Mean of noisy visits and the noise that their scatter shows. */
function measured(signal: Signal, visits: number, seed: number): Reflection & { noise: Float64Array } {
  const next = gaussian(seed);
  const traces = Array.from({ length: visits }, () =>
    Float64Array.from(
      { length: 2 * count },
      (_, i) => signal(i >> 1)[i % 2]! + (oneVisit / Math.SQRT2) * next(),
    ),
  );
  const s11 = traces[0]!.map((_, i) => traces.reduce((sum, trace) => sum + trace[i]!, 0) / visits);
  return { frequenciesHz, s11, noise: meanNoise(frequenciesHz, traces)! };
}

const nothing: Signal = () => [0, 0];
/** A dip 0.3 deep with its reactance rising through zero at 870 MHz, half as strong at the band's ends. */
const antenna =
  (size: number): Signal =>
  (k) => {
    const x = (k - 100) / 100;
    return [size * x * x, size * x];
  };

describe('the noise of a mean', () => {
  it('is that of one visit over the root of their number', () => {
    for (const visits of [2, 4, 14]) {
      for (let seed = 1; seed <= 10; seed += 1) {
        const { noise } = measured(antenna(0.5), visits, seed);
        // Windows of some 80 neighbours: 80 (V − 1) complex values, a deviation of 11 % of the power at V = 2.
        for (const one of noise) {
          const ratio = (one * Math.sqrt(visits)) / oneVisit;
          expect(ratio).toBeGreaterThan(0.75);
          expect(ratio).toBeLessThan(1.25);
        }
      }
    }
  });

  it('counts a reflection that drifts between the visits', () => {
    const visits = [0, 0.01].map((shift) => new Float64Array(2 * count).fill(0.2 + shift));
    // Re and im each 0.005 from their mean at both visits: variance 4 · 0.005², of the mean half of it.
    for (const one of meanNoise(frequenciesHz, visits)!) expect(one).toBeCloseTo(0.005 * Math.SQRT2, 9);
  });

  it('is not known from one visit, nor from a handful of values', () => {
    expect(meanNoise(frequenciesHz, [])).toBeUndefined();
    expect(meanNoise(frequenciesHz, [new Float64Array(2 * count)])).toBeUndefined();
    const three = [0, 1, 2].map(() => new Float64Array(6));
    expect(meanNoise([860e6, 868e6, 876e6], three)).toBeUndefined();
    expect(meanNoise([860e6, 868e6, 876e6], [...three, ...three])).toHaveLength(3);
    expect(() => meanNoise([1e9], [new Float64Array(4)])).toThrow(/one complex value/);
  });
});

describe('best match and resonance beside the noise', () => {
  it('are not invented for an antenna that reflects nothing', () => {
    for (let seed = 1; seed <= 100; seed += 1) {
      const band = measured(nothing, 2 + (seed % 13), seed);
      expect(bestMatch(band).frequencyHz).toEqual({
        kind: 'absent',
        because: expect.stringContaining('alike over the whole band'),
      });
      expect(resonance(band)).toEqual({ kind: 'absent', because: expect.stringContaining('is noise') });
    }
  });

  it('are not invented where the same comes back at all frequencies, whatever its phase', () => {
    for (let seed = 1; seed <= 20; seed += 1) {
      const real = measured(() => [0.3, 0], 4, seed);
      expect(bestMatch(real).frequencyHz.kind).toBe('absent');
      expect(resonance(real)).toMatchObject({ because: expect.stringContaining('is noise') });
      const long = measured(() => [0.2, 0.2], 4, seed);
      expect(resonance(long)).toMatchObject({ because: expect.stringContaining('inductive') });
      // Half of the band 1.4 deviations above zero, where noise crosses; the sign that shows is one.
      const barely = measured((k) => [0, (k < 100 ? 0.5 : 30) * oneVisit], 4, seed);
      expect(resonance(barely)).toMatchObject({ because: expect.stringContaining('inductive') });
      // A line turns the phase of a constant reflection: resonances, and yet no best match.
      const turned = measured((k) => [0.3 * Math.cos(0.02 * k), 0.3 * Math.sin(0.02 * k)], 4, seed);
      expect(bestMatch(turned).frequencyHz.kind).toBe('absent');
    }
  });

  it('stand where the antenna has them, down to 30 dB above the noise', () => {
    for (const size of [0.5, 3e-3]) {
      const band = measured(antenna(size), 4, 7);
      expect(resonance(band)).toMatchObject({ kind: 'value' });
      const found = bestMatch(band).frequencyHz;
      expect(found.kind).toBe('value');
      if (found.kind === 'value') expect(Math.abs(found.value - 870e6)).toBeLessThan(1e6);
    }
  });

  it('stand as they are read where nothing is known of the noise', () => {
    const { s11 } = measured(nothing, 4, 3);
    expect(bestMatch({ frequenciesHz, s11 }).frequencyHz.kind).not.toBe('absent');
    expect(resonance({ frequenciesHz, s11 }).kind).toBe('value');
  });
});
