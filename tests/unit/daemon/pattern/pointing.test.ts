// The direction of a beam beside noise: the scene's antennas, whose formulas are not those of the pattern,
// with the noise of 70 dB below their peak, which a receiver adds to each sample.
import { describe, expect, it } from 'vitest';
import { wrapDeg } from '../../../../daemon/pattern/angles.ts';
import { beamTop } from '../../../../daemon/pattern/beam-top.ts';
import { beamwidth } from '../../../../daemon/pattern/beamwidth.ts';
import type { Cut } from '../../../../daemon/pattern/cut.ts';
import { type CutFigureKey, cutFigures } from '../../../../daemon/pattern/figures.ts';
import { levelNoiseDb, peakOf } from '../../../../daemon/pattern/peak.ts';
import { pointing } from '../../../../daemon/pattern/pointing.ts';
import { Scene } from '../../../../mocks/scene/scene.ts';
import type { AntennaDescription } from '../../../../mocks/scene/scene-description.ts';
import { realizedGainDbi } from '../../../../mocks/scene/truth.ts';
import { part, turn } from './cut-samples.ts';
import { noisy } from './seeded-noise.ts';

const tries = 100;

function sceneCut(aut: AntennaDescription, plane: 'azimuth' | 'elevation' = 'azimuth'): Cut {
  const level = realizedGainDbi(new Scene({ antennas: { aut } }), 'aut', 868e6);
  const rest = { azimuthDeg: 0, elevationDeg: 0, rollDeg: 0 };
  return turn((deg) => Math.max(-60, level({ ...rest, [`${plane}Deg`]: deg })));
}

function readingOf(cut: Cut, floorDb: number | undefined, key: CutFigureKey): number {
  const figure = cutFigures(cut, floorDb === undefined ? {} : { floorDb })[key];
  if (figure.kind !== 'value') throw new Error(`${key}: ${JSON.stringify(figure)}`);
  return figure.value;
}

/** Root mean square of a figure's error over noises, 70 dB below the peak, stated or not. */
function rms(clean: Cut, key: CutFigureKey, wanted: number, stated: boolean): number {
  const floorDb = Math.max(...clean.levelDb) - 70;
  let sum = 0;
  for (let seed = 1; seed <= tries; seed += 1) {
    const cut = { ...clean, levelDb: noisy(clean.levelDb, floorDb, seed) };
    sum += wrapDeg(readingOf(cut, stated ? floorDb : undefined, key) - wanted) ** 2;
  }
  return Math.sqrt(sum / tries);
}

/** A lobe that falls faster on the right: −A(e^su − 1 − su), s its skew, A s² from the half-power width. */
const skewed =
  (widthDeg: number, topDeg: number, skew: number) =>
  (deg: number): number => {
    const u = (skew * wrapDeg(deg - topDeg)) / widthDeg;
    return Math.max(-30, ((-2 * 12.0412) / skew ** 2) * (Math.exp(Math.min(u, 9)) - 1 - u));
  };

describe('the direction of the peak with 70 dB of signal to noise', () => {
  it.each([
    ['azimuth', 0],
    ['elevation', 0],
    ['azimuth', 12.4],
    ['azimuth', 179.7],
  ] as const)('is within 0.1° rms for the Yagi: %s, turned by %d°', (plane, rotateAzimuthDeg) => {
    // Symmetric beams: the top is where the mount turned it, towards smaller positioner angles.
    const clean = sceneCut({ kind: 'yagi5', rotateAzimuthDeg }, plane);
    const wantedDeg = readingOf(clean, undefined, 'peakDeg');
    expect(Math.abs(wrapDeg(Math.abs(wantedDeg) - rotateAzimuthDeg))).toBeLessThan(0.02);
    expect(rms(clean, 'peakDeg', wantedDeg, true)).toBeLessThan(0.1);
    expect(rms(clean, 'peakDeg', wantedDeg, false)).toBeGreaterThan(0.2);
  });

  it('is within 0.3° rms for a cardioid, and its front-to-rear within 0.05 dB', () => {
    const clean = sceneCut({ kind: 'cardioid' });
    expect(rms(clean, 'peakDeg', 0, true)).toBeLessThan(0.3);
    expect(rms(clean, 'peakDeg', 0, false)).toBeGreaterThan(0.6);
    // Level (1 + cos)/2 at 120°, the edge of the rear sector: 1/4, 12.0412 dB.
    expect(rms(clean, 'frontToRearDb', 12.0412, true)).toBeLessThan(0.05);
    expect(rms(clean, 'frontToRearDb', 12.0412, false)).toBeGreaterThan(0.1);
  });

  it('has the deviation that the curve states', () => {
    const clean = sceneCut({ kind: 'yagi5' });
    const floorDb = Math.max(...clean.levelDb) - 70;
    const peak = peakOf(clean);
    const width = beamwidth(clean, peak);
    if (width.kind !== 'value') throw new Error(width.because);
    const { curve } = beamTop(clean, peak, width);
    const stated = curve!.angleDegPerDb * levelNoiseDb(peak.levelDb, floorDb);
    // A deviation from 100 tries is itself within 21 % three times out of a thousand; the window moves a little.
    expect(rms(clean, 'peakDeg', 0, true) / stated).toBeGreaterThan(0.75);
    expect(rms(clean, 'peakDeg', 0, true) / stated).toBeLessThan(1.3);
  });
});

describe('the direction of the peak without noise', () => {
  it('is that of the parabola where no noise is stated', () => {
    for (const skew of [-2, 0.5, 1.5]) {
      const cut = turn(skewed(60, 3.3, skew));
      expect(readingOf(cut, undefined, 'peakDeg')).toBe(peakOf(cut).angleDeg);
    }
  });

  it('is no worse than 0.05° for lopsided lobes, whatever noise is stated', () => {
    for (const widthDeg of [6, 24, 49, 61, 131]) {
      for (const skew of [-2, -1, 0.5, 1.5]) {
        for (const topDeg of [0, 3.3, 179.6]) {
          const cut = turn(skewed(widthDeg, topDeg, skew));
          // Of a beam of 6° the parabola through samples 1° apart is itself up to 0.06° off.
          const parabolaDeg = Math.abs(wrapDeg(peakOf(cut).angleDeg - topDeg));
          for (const floorDb of [-300, -100, -70, -50]) {
            const errorDeg = wrapDeg(readingOf(cut, floorDb, 'peakDeg') - topDeg);
            expect(Math.abs(errorDeg), `${widthDeg}° ${skew} ${topDeg} ${floorDb}`).toBeLessThanOrEqual(
              Math.max(0.05, parabolaDeg),
            );
          }
        }
      }
    }
  });
});

describe('whose angle counts', () => {
  it('is the parabola’s where the curve does not describe the top', () => {
    // A spike of 0.2 dB beside the middle of a wide beam: thousands of deviations, no noise.
    const cut = turn(
      (deg) => Math.max(-30, -12.04 * (deg / 60) ** 2) + 0.2 * Math.exp(-(((deg - 6) / 1.5) ** 2)),
    );
    expect(readingOf(cut, -100, 'peakDeg')).toBe(peakOf(cut).angleDeg);
    expect(readingOf(cut, -100, 'peakDeg')).toBeGreaterThan(5);
  });

  it('is the parabola’s on a beam of few samples, of none at all, and in all directions alike', () => {
    const narrow = turn(skewed(12, 0.3, 1));
    expect(readingOf(narrow, -40, 'peakDeg')).toBe(peakOf(narrow).angleDeg);
    const cut = part(skewed(60, 0, 1), -10, 10);
    const peak = peakOf(cut);
    expect(pointing(cut, peak, undefined, -40)).toBe(peak);
    const flat = { ...peak, flat: true };
    expect(
      pointing(cut, flat, { levelDb: 0, curve: { angleDeg: 1, bendDb: -1, angleDegPerDb: 0 } }, -40),
    ).toBe(flat);
  });

  it('is the parabola’s where it is the steadier', () => {
    const cut = part(skewed(60, 0, 1), -60, 60);
    const peak = peakOf(cut);
    // Weights of a vertex in the middle of steps of 1°: −1/2, 0, 1/2; over the bend: 0.7071/0.01 degrees per dB.
    const curve = { angleDeg: 0.5, bendDb: -0.01 };
    expect(pointing(cut, peak, { levelDb: 0, curve: { ...curve, angleDegPerDb: 75 } }, -60)).toBe(peak);
    const steadier = pointing(cut, peak, { levelDb: 0, curve: { ...curve, angleDegPerDb: 65 } }, -60);
    expect(steadier).toMatchObject({
      angleDeg: 0.5,
      refined: true,
      index: peak.index,
      levelDb: peak.levelDb,
    });
  });
});

describe('the noise of a level', () => {
  it('is 8.686 dB times half the noise power’s root over the amplitude', () => {
    // 70 dB: 10^−3.5/√2 of the amplitude, times 20/ln 10.
    expect(levelNoiseDb(3, -67)).toBeCloseTo(8.685889638 * 2.23606798e-4, 9);
  });
});
