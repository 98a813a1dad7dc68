import { describe, expect, it } from 'vitest';
import { beamwidth } from '../../../../daemon/pattern/beamwidth.ts';
import type { Cut } from '../../../../daemon/pattern/cut.ts';
import { cutNoiseDb } from '../../../../daemon/pattern/cut-noise.ts';
import { cutFigures } from '../../../../daemon/pattern/figures.ts';
import { peakOf } from '../../../../daemon/pattern/peak.ts';
import { part, turn } from './cut-samples.ts';
import { noisy } from './seeded-noise.ts';

const db = (amplitude: number) => 20 * Math.log10(Math.max(1e-6, Math.abs(amplitude)));
const radians = (deg: number) => (deg * Math.PI) / 180;
/** A main lobe, nulls through zero, a back lobe. */
const yagiLike = turn((deg) => db(0.6 * Math.cos(radians(deg)) + 0.4));

function noiseOf(cut: Cut): number | undefined {
  const peak = peakOf(cut);
  return cutNoiseDb(cut, peak, beamwidth(cut, peak));
}

describe('the noise of a cut', () => {
  it.each([-70, -55, -40])('of %d dB is read within 2 dB', (noiseDb) => {
    for (let seed = 1; seed <= 20; seed += 1) {
      const cut = { ...yagiLike, levelDb: noisy(yagiLike.levelDb, noiseDb, seed) };
      expect(Math.abs(noiseOf(cut)! - noiseDb)).toBeLessThan(2);
    }
  });

  it('moves with the level and is far down where there is none', () => {
    const cut = { ...yagiLike, levelDb: noisy(yagiLike.levelDb, -50, 3) };
    const lower = { ...cut, levelDb: cut.levelDb.map((level) => level - 30) };
    expect(noiseOf(lower)).toBeCloseTo(noiseOf(cut)! - 30, 9);
    expect(noiseOf(yagiLike)).toBeLessThan(-90);
  });

  it('is not guessed from a coarse cut or one without a beam', () => {
    expect(noiseOf(turn((deg) => db(Math.cos(radians(deg) / 2) ** 4), 15))).toBeUndefined();
    expect(noiseOf(turn((deg) => Math.cos(radians(deg))))).toBeUndefined();
    expect(noiseOf(part((deg) => -0.01 * deg * deg, -30, 30, 1))).toBeDefined();
  });
});

describe('lobes in noise', () => {
  /** A main lobe, and a rear of −26 to −28 dB without any lobe. */
  const flatRear = turn((deg) => db(Math.cos(radians(deg) / 2) ** 6 + 0.045));

  it('are not made of it: 100 noisy cuts without a side lobe show none, nor a shoulder', () => {
    for (let seed = 1; seed <= 100; seed += 1) {
      const cut = { ...flatRear, levelDb: noisy(flatRear.levelDb, -45, seed) };
      const figures = cutFigures(cut);
      expect(figures.sideLobeLevelDb.kind, `seed ${seed}`).toBe('absent');
      expect(figures.firstSideLobeLeftDb.kind, `seed ${seed}`).toBe('absent');
      expect(figures.firstSideLobeRightDb.kind, `seed ${seed}`).toBe('absent');
    }
  });

  it('are found in it: a lobe 18 dB down, 27 dB over the noise', () => {
    const back = turn((deg) => db(Math.cos(radians(deg) / 2) ** 6 - 0.126 * Math.sin(radians(deg) / 2) ** 6));
    for (let seed = 1; seed <= 100; seed += 1) {
      const figures = cutFigures({ ...back, levelDb: noisy(back.levelDb, -45, seed) });
      const level = figures.sideLobeLevelDb;
      expect(level.kind === 'value' && Math.abs(level.value + 18), `seed ${seed}`).toBeLessThan(1);
      expect(figures.firstSideLobeLeftDb).toEqual(level);
      expect(figures.firstSideLobeRightDb).toEqual(level);
    }
  });
});
