import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { wrapDeg } from '../../../../daemon/pattern/angles.ts';
import type { Cut } from '../../../../daemon/pattern/cut.ts';
import type { Figure } from '../../../../daemon/pattern/figure.ts';
import { type CutFigures, cutFigureKeys, cutFigures } from '../../../../daemon/pattern/figures.ts';
import { PatternError } from '../../../../daemon/pattern/pattern-error.ts';
import { anyCut, distinctTurn, parabola, part, turn } from './cut-samples.ts';

const number = (figure: Figure | undefined): number =>
  figure === undefined || figure.kind === 'absent' ? Number.NaN : figure.value;

/** All figures the same but for those named; numbers within 1e-6. */
function expectSame(actual: CutFigures, expected: CutFigures, but: string[] = []): void {
  for (const key of cutFigureKeys) {
    if (but.includes(key)) continue;
    expect(actual[key].kind, `${key}: ${JSON.stringify([actual[key], expected[key]])}`).toBe(
      expected[key].kind,
    );
    if (actual[key].kind !== 'absent') {
      expect(Math.abs(number(actual[key]) - number(expected[key])), key).toBeLessThan(1e-6);
    }
  }
}

describe('figures of a cut', () => {
  it('reads a lobe of 40° that squints by 12° as it was made', () => {
    const figures = cutFigures(
      turn((deg) => Math.max(-30, parabola(40, 12, 7)(deg))),
      { gainConstantDb: 1.5 },
    );
    expect(number(figures.peakDeg)).toBeCloseTo(12, 9);
    // Linear in dB between samples reads a lobe narrow: at a step of 1/40 of the width by under 0.04 %.
    expect(number(figures.halfPowerBeamwidthDeg)).toBeGreaterThan(40 * 0.9996);
    expect(number(figures.halfPowerBeamwidthDeg)).toBeLessThanOrEqual(40 + 1e-9);
    expect(number(figures.tenDbBeamwidthDeg)).toBeCloseTo(40 * Math.sqrt(10 / (10 * Math.log10(2))), 1);
    expect(number(figures.squintDeg)).toBeCloseTo(12, 6);
    expect(number(figures.frontToBackDb)).toBeCloseTo(37, 9);
    expect(number(figures.frontToRearDb)).toBeCloseTo(37, 9);
    expect(number(figures.circularityDb)).toBeCloseTo(37, 9);
    expect(number(figures.realizedGainDbi)).toBeCloseTo(8.5, 9);
    expect(figures.sideLobeLevelDb.kind).toBe('absent');
  });

  it('takes squint from boresight', () => {
    const figures = cutFigures(
      turn((deg) => Math.max(-30, parabola(40, 12)(deg))),
      { boresightDeg: 10 },
    );
    expect(number(figures.squintDeg)).toBeCloseTo(2, 6);
  });

  it('has no gain without a gain constant', () => {
    expect(cutFigures(turn(parabola(90)))).not.toHaveProperty('realizedGainDbi');
  });

  it('says of a circle that it has no direction', () => {
    const figures = cutFigures(turn(() => -3));
    for (const key of cutFigureKeys) {
      if (key === 'circularityDb') expect(figures[key]).toEqual({ kind: 'value', value: 0 });
      else expect(figures[key].kind, key).toBe('absent');
    }
  });

  it('names the side on which a part of a turn is too short', () => {
    const figures = cutFigures(part(parabola(60), -20, 70));
    expect(figures.halfPowerBeamwidthDeg).toEqual({
      kind: 'absent',
      because: 'does not fall 3 dB on the left side: the cut ends at -20°',
    });
    expect(figures.tenDbBeamwidthDeg).toMatchObject({ because: expect.stringContaining('left side') });
    expect(figures.frontToBackDb.kind).toBe('absent');
    expect(figures.frontToRearDb.kind).toBe('absent');
    expect(figures.circularityDb.kind).toBe('absent');
    expect(figures.squintDeg).toMatchObject({
      kind: 'absent',
      because: expect.stringContaining('left side'),
    });
    expect(figures.peakDeg.kind).toBe('value');
  });

  it('is absent as a whole when the peak drowns in the floor', () => {
    const figures = cutFigures(turn(parabola(90)), { floorDb: -2, gainConstantDb: 0 });
    for (const key of [...cutFigureKeys, 'realizedGainDbi' as const]) {
      expect(figures[key], key).toEqual({
        kind: 'absent',
        because: 'the peak is not resolved from the floor',
      });
    }
  });

  it('bounds front-to-back when the back lies in the floor, and flags it near the floor', () => {
    const cut = turn((deg) => (Math.abs(deg) > 90 ? -32 : Math.max(-25, parabola(60)(deg))));
    expect(cutFigures(cut).frontToBackDb).toEqual({ kind: 'value', value: 32 });
    expect(cutFigures(cut, { floorDb: -40 }).frontToBackDb).toEqual({
      kind: 'value',
      value: 32,
      note: 'within 20 dB of the floor',
    });
    expect(cutFigures(cut, { floorDb: -33 }).frontToBackDb).toMatchObject({
      kind: 'bound',
      bound: 'lower',
      value: 32,
    });
    expect(cutFigures(cut, { floorDb: -31 }).frontToBackDb).toMatchObject({ kind: 'bound', value: 31 });
  });

  it('refuses cuts that do not fit', () => {
    const good = turn(parabola(60));
    const short: Cut = { ...good, levelDb: good.levelDb.slice(1) };
    const holed: Cut = { ...good, levelDb: good.levelDb.map((db, k) => (k === 7 ? Number.NaN : db)) };
    expect(() => cutFigures(short)).toThrow(PatternError);
    expect(() => cutFigures(holed)).toThrow(/NaN dB/);
    expect(() => cutFigures(good, { floorDb: Number.NaN })).toThrow(PatternError);
    expect(() => cutFigures(good, { prominenceDb: 0 })).toThrow(PatternError);
    expect(() => cutFigures(good, { rearHalfWidthDeg: 181 })).toThrow(PatternError);
  });

  it('does 401 frequencies of 361 angles well under a second', () => {
    const cuts = Array.from({ length: 401 }, (_, k) =>
      turn((deg) => 20 * Math.log10(Math.abs(Math.cos((deg * Math.PI) / 180 / 2)) + 0.05 + k * 1e-4)),
    );
    cutFigures(cuts[0]!);
    // Processor time, so that a busy machine does not fail it.
    const start = process.cpuUsage();
    for (const cut of cuts) cutFigures(cut);
    expect(process.cpuUsage(start).user / 1000).toBeLessThan(1000);
  });
});

describe('properties of the figures of a cut', () => {
  it('gives finite numbers for any finite cut and floor', () => {
    fc.assert(
      fc.property(
        anyCut,
        fc.option(fc.double({ min: -1000, max: 1000, noNaN: true }), { nil: undefined }),
        fc.double({ min: 0.1, max: 20, noNaN: true }),
        (cut, floorDb, prominenceDb) => {
          const options = { prominenceDb, gainConstantDb: 3, ...(floorDb === undefined ? {} : { floorDb }) };
          for (const [key, figure] of Object.entries(cutFigures(cut, options)) as [string, Figure][]) {
            if (figure.kind === 'absent') expect(figure.because, key).not.toMatch(/NaN|Infinity|undefined/);
            else {
              expect(Number.isFinite(figure.value), key).toBe(true);
              expect(figure.note ?? '', key).not.toMatch(/NaN|Infinity|undefined/);
            }
          }
        },
      ),
      { numRuns: 1500 },
    );
  });

  it('turns directions and nothing else when the cut is turned by whole samples', () => {
    fc.assert(
      fc.property(distinctTurn, fc.nat(71), (cut, by) => {
        const count = cut.levelDb.length;
        const turned: Cut = {
          ...cut,
          levelDb: cut.levelDb.map((_, k) => cut.levelDb[(k + count - (by % count)) % count]!),
        };
        const [before, after] = [cutFigures(cut), cutFigures(turned)];
        expectSame(after, before, ['peakDeg', 'squintDeg']);
        const stepDeg = ((by % count) * 360) / count;
        for (const key of ['peakDeg', 'squintDeg'] as const) {
          expect(after[key].kind).toBe(before[key].kind);
          if (before[key].kind === 'absent') continue;
          expect(Math.abs(wrapDeg(number(after[key]) - number(before[key]) - stepDeg))).toBeLessThan(1e-6);
        }
      }),
      { numRuns: 500 },
    );
  });

  it('moves the gain and nothing else when a constant level is added', () => {
    fc.assert(
      fc.property(distinctTurn, fc.integer({ min: -100, max: 100 }), (cut, addedDb) => {
        const before = cutFigures(cut, { gainConstantDb: 0 });
        const after = cutFigures(
          { ...cut, levelDb: cut.levelDb.map((db) => db + addedDb) },
          { gainConstantDb: 0 },
        );
        expectSame(after, before);
        expect(number(after.realizedGainDbi) - number(before.realizedGainDbi)).toBeCloseTo(addedDb, 6);
      }),
      { numRuns: 500 },
    );
  });

  it('exchanges left and right when the cut is mirrored', () => {
    fc.assert(
      fc.property(distinctTurn, (cut) => {
        const mirrored: Cut = {
          anglesDeg: cut.anglesDeg.map((_, k) => 0 - cut.anglesDeg.at(-1 - k)!),
          levelDb: cut.levelDb.slice().reverse(),
          periodic: true,
        };
        const [before, after] = [cutFigures(cut), cutFigures(mirrored)];
        const sided = ['peakDeg', 'squintDeg', 'firstSideLobeLeftDb', 'firstSideLobeRightDb'];
        expectSame(after, before, sided);
        expect(Math.abs(wrapDeg(number(after.peakDeg) + number(before.peakDeg)))).toBeLessThan(1e-6);
        expect(after.squintDeg.kind).toBe(before.squintDeg.kind);
        if (before.squintDeg.kind === 'value') {
          expect(Math.abs(wrapDeg(number(after.squintDeg) + number(before.squintDeg)))).toBeLessThan(1e-6);
        }
        expectSame(
          {
            ...before,
            firstSideLobeLeftDb: after.firstSideLobeRightDb,
            firstSideLobeRightDb: after.firstSideLobeLeftDb,
          },
          before,
        );
      }),
      { numRuns: 500 },
    );
  });

  it('reads beamwidths with an error of the order of the step squared', () => {
    fc.assert(
      fc.property(
        fc.double({ min: 1, max: 6, noNaN: true }),
        fc.double({ min: -0.5, max: 0.5, noNaN: true }),
        (power, shift) => {
          // Power cos^2p of half the angle: a lobe with one null behind; its width in closed form.
          const trueDeg = (4 * Math.acos(0.5 ** (1 / (2 * power))) * 180) / Math.PI;
          for (const stepDeg of [5, 2.5, 1, 0.5]) {
            const lobe = (deg: number) =>
              Math.max(-100, 20 * power * Math.log10(Math.abs(Math.cos(((deg - shift) * Math.PI) / 360))));
            const figure = cutFigures(turn(lobe, stepDeg)).halfPowerBeamwidthDeg;
            // Linear reading of a parabola is off by at most step²/(2 × width), of the widest lobe here by 1.6
            // times that; 0.0005° for the top's curve.
            expect(Math.abs(number(figure) - trueDeg)).toBeLessThan((0.8 * stepDeg ** 2) / trueDeg + 0.0005);
          }
        },
      ),
      { numRuns: 100 },
    );
  });
});
