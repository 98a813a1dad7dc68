import { describe, expect, it } from 'vitest';
import { tieNoiseDb } from '../../../../daemon/pattern/tie-noise.ts';
import { stream } from '../../../../mocks/random.ts';

const frequenciesHz = Float64Array.from({ length: 201 }, (_, k) => 820e6 + k * 0.5e6);

/** Boresight visits: a null in the middle of the band, slow drift, complex noise of a known power. */
function visits(count: number, noiseAmplitude: number, seed: number): Float64Array[] {
  const random = stream(seed, 'tie noise');
  return Array.from({ length: count }, (_, visit) =>
    Float64Array.from({ length: 402 }, (_, i) => {
      const k = i >> 1;
      const level = 0.01 * Math.abs(k - 100) * (1 + 0.02 * visit);
      const signal = i % 2 === 0 ? level : 0;
      return signal + (noiseAmplitude / Math.SQRT2) * random.normal();
    }),
  );
}

describe('the noise between ties', () => {
  it('is the noise that was put in, within what 7 visits and 40 neighbours allow', () => {
    for (const seed of [1, 2, 3, 4, 5]) {
      const found = tieNoiseDb(frequenciesHz, visits(8, 1e-4, seed))!;
      const meanDb = found.reduce((sum, db) => sum + db, 0) / found.length;
      // 7 × 201 complex values share one first tie: half their noise is common. 20 log 1e-4 = −80 dB.
      expect(meanDb).toBeGreaterThan(-80.8);
      expect(meanDb).toBeLessThan(-79.2);
      for (const db of found) expect(Math.abs(db + 80)).toBeLessThan(2);
    }
  });

  it('does not take drift for noise', () => {
    const steady = visits(4, 1e-9, 1);
    for (const db of tieNoiseDb(frequenciesHz, steady)!) expect(db).toBeLessThan(-170);
  });

  it('says nothing from one visit, or from too few values', () => {
    expect(tieNoiseDb(frequenciesHz, visits(1, 1e-4, 1))).toBeUndefined();
    expect(tieNoiseDb(Float64Array.of(1e9, 2e9), [new Float64Array(4), new Float64Array(4)])).toBeUndefined();
  });
});
