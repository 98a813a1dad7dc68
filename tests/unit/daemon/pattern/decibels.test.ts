import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  amplitudeDb,
  amplitudeRatio,
  lowestLevelDb,
  powerDb,
  powerRatio,
  traceLevelDb,
} from '../../../../daemon/pattern/decibels.ts';
import { farFieldDistanceM } from '../../../../daemon/pattern/far-field.ts';
import { absentFigure, boundFigure, valueFigure } from '../../../../daemon/pattern/figure.ts';
import { freeSpaceLossDb, transmissionDb } from '../../../../daemon/pattern/friis.ts';
import { levelAt } from '../../../../daemon/pattern/level-at.ts';
import { PatternError } from '../../../../daemon/pattern/pattern-error.ts';
import { byHand } from './cut-samples.ts';

describe('decibels', () => {
  it('hold zero at a finite level', () => {
    expect(powerDb(0)).toBe(lowestLevelDb);
    expect(amplitudeDb(0)).toBe(lowestLevelDb);
    expect(amplitudeDb(Number.MIN_VALUE)).toBe(lowestLevelDb);
  });

  it('go there and back', () => {
    fc.assert(
      fc.property(fc.double({ min: -390, max: 390, noNaN: true }), (db) => {
        expect(amplitudeDb(amplitudeRatio(db))).toBeCloseTo(db, 9);
        expect(powerDb(powerRatio(db))).toBeCloseTo(db, 9);
        expect(powerRatio(db)).toBeCloseTo(amplitudeRatio(db) ** 2, -300);
      }),
    );
  });

  it('refuse what is no ratio and no level', () => {
    for (const bad of [-1, Number.NaN, Number.POSITIVE_INFINITY]) {
      expect(() => powerDb(bad)).toThrow(PatternError);
      expect(() => amplitudeDb(bad)).toThrow(PatternError);
    }
    expect(() => powerRatio(4000)).toThrow(PatternError);
    expect(() => amplitudeRatio(Number.NaN)).toThrow(PatternError);
    expect(() => traceLevelDb(new Float64Array(3))).toThrow(/pairs/);
  });

  it('of a trace are those of its magnitudes', () => {
    expect([...traceLevelDb(Float64Array.of(0.6, 0.8, 0, 0.1, 0, 0))]).toEqual([0, -20, lowestLevelDb]);
  });
});

describe('a figure', () => {
  it('is finite, without negative zero, and has a note only where there is one', () => {
    expect(valueFigure(-0)).toEqual({ kind: 'value', value: 0 });
    expect(boundFigure('upper', 3, 'why')).toEqual({ kind: 'bound', bound: 'upper', value: 3, note: 'why' });
    expect(absentFigure('why')).toEqual({ kind: 'absent', because: 'why' });
    expect(() => valueFigure(Number.NaN)).toThrow(PatternError);
    expect(() => boundFigure('lower', Number.NEGATIVE_INFINITY)).toThrow(PatternError);
  });
});

describe('free space', () => {
  it('loses 6.02 dB with twice the distance and refuses lengths that are none', () => {
    expect(freeSpaceLossDb(6, 868e6) - freeSpaceLossDb(3, 868e6)).toBeCloseTo(20 * Math.log10(2), 9);
    expect(transmissionDb(3, 4, 5, 868e6) - transmissionDb(1, 1, 5, 868e6)).toBeCloseTo(5, 9);
    expect(() => freeSpaceLossDb(0, 868e6)).toThrow(PatternError);
    expect(() => farFieldDistanceM(-1, 868e6)).toThrow(PatternError);
    expect(() => transmissionDb(Number.NaN, 0, 1, 1e9)).toThrow(PatternError);
  });
});

describe('the level at an angle', () => {
  const full = byHand([-90, 0, 90, 180], [-10, 0, -10, -30], true);
  const some = byHand([-90, 0, 90], [-10, 0, -10]);

  it.each([
    [0, 0],
    [45, -5],
    [135, -20],
    [-135, -20],
    [225, -20],
    [-180, -30],
    [360 + 45, -5],
    [-720 + 45, -5],
  ])('of a full turn at %d° is %d dB', (angleDeg, expected) => {
    const found = levelAt(full, angleDeg);
    expect(found.kind === 'value' && found.value).toBeCloseTo(expected, 12);
  });

  it('is absent beyond a part of a turn, and there at both its ends', () => {
    expect(levelAt(some, 91)).toEqual({
      kind: 'absent',
      because: 'the cut from -90° to 90° does not reach 91°',
    });
    expect(levelAt(some, 180).kind).toBe('absent');
    expect(levelAt(some, 90)).toEqual({ kind: 'value', value: -10 });
    expect(levelAt(some, -90)).toEqual({ kind: 'value', value: -10 });
    expect(levelAt(some, 270)).toEqual({ kind: 'value', value: -10 });
    expect(() => levelAt(some, Number.NaN)).toThrow(PatternError);
  });
});
