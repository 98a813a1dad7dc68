import { describe, expect, it } from 'vitest';
import type { Cut } from '../../../../daemon/pattern/cut.ts';
import { extremaOf } from '../../../../daemon/pattern/extrema.ts';
import { cutFigures } from '../../../../daemon/pattern/figures.ts';
import { floorBeside } from '../../../../daemon/pattern/floor.ts';
import { firstNull, firstNullBeamwidth, nullDepthDb } from '../../../../daemon/pattern/nulls.ts';
import { peakOf } from '../../../../daemon/pattern/peak.ts';
import { shoulderBeside } from '../../../../daemon/pattern/side-lobes.ts';
import { byHand, part, turn } from './cut-samples.ts';

const db = (amplitude: number) => Math.max(-90, 20 * Math.log10(Math.abs(amplitude)));
/** A lobe of amplitude exp(−(θ/width)²) at an angle. */
const bump = (deg: number, atDeg: number, widthDeg: number, size: number) =>
  size * Math.exp(-(((deg - atDeg) / widthDeg) ** 2));

/** Main lobe at 0, side lobes at −50 (−12 dB) and 60 (−16 dB), back lobe at 180 (−20 dB), −30 dB between. */
const lobes = turn((deg) => {
  const back = bump(deg < 0 ? deg + 360 : deg, 180, 15, 0.1);
  return db(
    bump(deg, 0, 18, 1) +
      bump(deg, -50, 9, 10 ** (-12 / 20)) +
      bump(deg, 60, 9, 10 ** (-16 / 20)) +
      back +
      0.01,
  );
});

describe('side lobes', () => {
  it('are told apart by side, the highest by level', () => {
    const figures = cutFigures(lobes);
    expect(figures.firstSideLobeLeftDb).toMatchObject({ kind: 'value', note: 'lobe at -50°' });
    expect(figures.firstSideLobeRightDb).toMatchObject({ kind: 'value', note: 'lobe at 60°' });
    for (const [figure, expectedDb] of [
      [figures.firstSideLobeLeftDb, -12],
      [figures.firstSideLobeRightDb, -16],
      [figures.sideLobeLevelDb, -12],
    ] as const) {
      // The constant 0.01 beneath adds to all of them.
      const sum = 20 * Math.log10((10 ** (expectedDb / 20) + 0.01) / 1.01);
      expect(figure.kind === 'value' && Math.abs(figure.value - sum)).toBeLessThan(0.02);
    }
  });

  it('count the back lobe', () => {
    const cut = turn((deg) =>
      db(bump(deg, 0, 30, 1) + bump(deg < 0 ? deg + 360 : deg, 180, 20, 0.2) + 0.001),
    );
    const figures = cutFigures(cut);
    for (const key of ['firstSideLobeLeftDb', 'firstSideLobeRightDb', 'sideLobeLevelDb'] as const) {
      expect(figures[key]).toMatchObject({ kind: 'value', note: 'lobe at 180°' });
    }
  });

  it('count by prominence: a ripple of 0.6 dB is none at 1 dB and one at 0.5 dB', () => {
    const cut = part((deg) => -0.01 * deg * deg + (deg > 40 ? 0 : 0), -30, 30);
    const rippled: Cut = byHand([0, 1, 2, 3, 4, 5, 6, 7], [0, -10, -20, -21, -20.4, -21, -30, -40]);
    expect(cutFigures(cut).sideLobeLevelDb.kind).toBe('absent');
    expect(cutFigures(rippled, { prominenceDb: 1 }).sideLobeLevelDb.kind).toBe('absent');
    expect(cutFigures(rippled, { prominenceDb: 0.5 }).sideLobeLevelDb.kind).toBe('value');
  });

  it('are absent beside a part of a turn that shows none, side in words', () => {
    const figures = cutFigures(part((deg) => lobes.levelDb[lobes.anglesDeg.indexOf(deg)]!, -80, 30));
    expect(figures.firstSideLobeLeftDb.kind).toBe('value');
    expect(figures.firstSideLobeRightDb).toEqual({
      kind: 'absent',
      because: 'no side lobe that stands out by 1 dB on the right side before the cut ends',
    });
    expect(figures.firstNullBeamwidthDeg).toEqual({
      kind: 'absent',
      because: 'no null 1 dB deep on the right side before the cut ends',
    });
  });

  it('are not made by noise at the floor', () => {
    const noisy: Cut = {
      ...lobes,
      levelDb: lobes.levelDb.map((level, k) => (level < -34 ? -37 + 2.5 * Math.sin(k * 2.4) : level)),
    };
    const without = extremaOf(noisy, peakOf(noisy)).right.length;
    const withFloor = extremaOf(noisy, peakOf(noisy), { resolvedDb: -34 }).right.length;
    expect(without).toBeGreaterThan(withFloor);
    // Null and lobe in turn: three lobes, four nulls.
    expect(withFloor).toBe(7);
  });

  it('carry the flag of the floor', () => {
    expect(cutFigures(lobes, { floorDb: -34 }).firstSideLobeRightDb).toMatchObject({
      note: 'lobe at 60°, within 20 dB of the floor',
    });
  });
});

describe('shoulders', () => {
  // A side lobe 10.5 dB down, in phase with the main lobe and run into it: the flank falls, pauses, falls.
  const flank = (sign: number) =>
    turn((deg) => db(bump(deg, 0, 18, 1) + bump(sign * deg, 28, 9, 0.3) + 0.003));

  it('are reported as shoulders, on their side alone', () => {
    const cut = flank(1);
    const right = cutFigures(cut).firstSideLobeRightDb;
    expect(right).toMatchObject({ kind: 'value', note: expect.stringMatching(/^shoulder at \d/) });
    expect(right.kind === 'value' && right.value).toBeGreaterThan(-9);
    expect(right.kind === 'value' && right.value).toBeLessThan(-6);
    expect(cutFigures(cut).firstSideLobeLeftDb.kind).toBe('absent');
    expect(cutFigures(flank(-1)).firstSideLobeLeftDb).toMatchObject({
      note: expect.stringMatching(/^shoulder at -\d/),
    });
  });

  it('are none on plain lobes, wide or narrow, with a deep null or a filled one', () => {
    for (const width of [10, 18, 40]) {
      for (const filling of [0.03, 0.001]) {
        const cut = turn((deg) => db(bump(deg, 0, width, 1) + filling));
        const [peak, extrema] = [peakOf(cut), extremaOf(cut, peakOf(cut))];
        expect(shoulderBeside(cut, peak, extrema, 'left')).toBeUndefined();
        expect(shoulderBeside(cut, peak, extrema, 'right')).toBeUndefined();
      }
    }
    const cosine = turn((deg) => db(Math.cos((deg * Math.PI) / 180)));
    expect(
      shoulderBeside(cosine, peakOf(cosine), extremaOf(cosine, peakOf(cosine)), 'right'),
    ).toBeUndefined();
  });
});

describe('nulls', () => {
  it('lie where the amplitude runs through zero, between samples', () => {
    const cut = part((deg) => db((deg - 7.3) / 40), -20, 12);
    const found = firstNull(extremaOf(cut, peakOf(cut)), 'right');
    expect(found.kind).toBe('null');
    expect(found.kind === 'null' && found.angleDeg).toBeCloseTo(7.3, 6);
  });

  it('give one width for both sides, and a whole turn for a single null', () => {
    const width = firstNullBeamwidth(extremaOf(lobes, peakOf(lobes)));
    expect(width.kind === 'value' && width.value).toBeGreaterThan(60);
    expect(width.kind === 'value' && width.value).toBeLessThan(90);
    const cardioid = turn((deg) => db((1 + Math.cos((deg * Math.PI) / 180)) / 2));
    expect(firstNullBeamwidth(extremaOf(cardioid, peakOf(cardioid)))).toMatchObject({
      value: 360,
      note: expect.stringContaining('one null alone'),
    });
  });

  it('are as deep as sampled, or deeper where the floor hides them', () => {
    const cut = byHand([-3, -2, -1, 0, 1, 2, 3], [-9, -30, -5, 0, -6, -45, -12]);
    const [peak, extrema] = [peakOf(cut), extremaOf(cut, peakOf(cut))];
    const left = firstNull(extrema, 'left');
    const right = firstNull(extrema, 'right');
    if (left.kind === 'absent' || right.kind === 'absent') throw new Error('no nulls');
    const floor = floorBeside(peak.levelDb, -43);
    const depth = (levelDb: number) => peak.levelDb - levelDb;
    expect(nullDepthDb(left, peak.levelDb, floor)).toMatchObject({ kind: 'value', value: depth(-30) });
    expect(nullDepthDb(right, peak.levelDb, floor)).toMatchObject({
      kind: 'bound',
      bound: 'lower',
      value: depth(-43),
    });
  });
});
