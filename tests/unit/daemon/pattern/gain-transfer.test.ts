import { describe, expect, it } from 'vitest';
import {
  gainConstantDb,
  ieeeGainDbi,
  realizedGainDbi,
  tableGainDbi,
} from '../../../../daemon/pattern/gain-transfer.ts';
import { PatternError } from '../../../../daemon/pattern/pattern-error.ts';

describe('a gain table', () => {
  const table = [
    { frequencyHz: 800e6, gainDbi: 7 },
    { frequencyHz: 850e6, gainDbi: 8 },
    { frequencyHz: 950e6, gainDbi: 7.5 },
  ];

  it.each([
    [800e6, 7],
    [825e6, 7.5],
    [850e6, 8],
    [900e6, 7.75],
    [950e6, 7.5],
  ])('is linear in dB: at %d Hz %d dBi', (frequencyHz, gainDbi) => {
    expect(tableGainDbi(table, frequencyHz)).toBeCloseTo(gainDbi, 12);
  });

  it('is never read beyond its ends', () => {
    for (const frequencyHz of [799.9e6, 950.1e6, Number.NaN]) {
      expect(() => tableGainDbi(table, frequencyHz)).toThrow(PatternError);
      expect(() => tableGainDbi(table, frequencyHz)).toThrow(/widen the table/);
    }
    expect(tableGainDbi([table[0]!], 800e6)).toBe(7);
  });

  it('must be in order and not empty', () => {
    expect(() => tableGainDbi([], 1e9)).toThrow(/empty/);
    expect(() => tableGainDbi([...table].reverse(), 850e6)).toThrow(/out of order/);
    expect(() => tableGainDbi([{ frequencyHz: 1e9, gainDbi: Number.NaN }], 1e9)).toThrow(PatternError);
  });
});

describe('stated and realized gain', () => {
  it('differ by the mismatch loss: |Γ| of 0.5 costs 10 log(0.75)', () => {
    const lossDb = -10 * Math.log10(0.75);
    const realized = realizedGainDbi(8, 'ieee', 0.5);
    expect(realized.kind === 'value' && realized.value).toBeCloseTo(8 - lossDb, 12);
    const ieee = ieeeGainDbi(8, 0.5);
    expect(ieee.kind === 'value' && ieee.value).toBeCloseTo(8 + lossDb, 12);
    expect(realizedGainDbi(8, 'realized', 0.5)).toEqual({ kind: 'value', value: 8 });
  });

  it('are absent where the reflection says nothing', () => {
    expect(realizedGainDbi(8, 'ieee').kind).toBe('absent');
    expect(realizedGainDbi(8, 'ieee', 1).kind).toBe('absent');
    expect(ieeeGainDbi(8, 1.02).kind).toBe('absent');
  });
});

describe('the gain constant', () => {
  it('carries gain and level of the reference, added loss and range length with their signs', () => {
    const reference = { referenceGainDbi: 7, referenceLevelDb: -40 };
    // An AUT seen 1 dB stronger is 1 dB better.
    expect(-39 + gainConstantDb(reference)).toBeCloseTo(8, 12);
    // The same reading through 3 dB more of cable: 3 dB better still.
    expect(-39 + gainConstantDb({ ...reference, addedLossDb: 3 })).toBeCloseTo(11, 12);
    // The same reading from twice as far: 6.02 dB better.
    const further = { ...reference, referenceRangeLengthM: 3, autRangeLengthM: 6 };
    expect(-39 + gainConstantDb(further)).toBeCloseTo(14.0206, 4);
  });

  it('refuses half of a pair and lengths that are none', () => {
    const reference = { referenceGainDbi: 7, referenceLevelDb: -40 };
    expect(() => gainConstantDb({ ...reference, autRangeLengthM: 3 })).toThrow(/both/);
    expect(() => gainConstantDb({ ...reference, autRangeLengthM: 0, referenceRangeLengthM: 3 })).toThrow(
      PatternError,
    );
    expect(() => gainConstantDb({ ...reference, referenceLevelDb: Number.NEGATIVE_INFINITY })).toThrow(
      PatternError,
    );
  });
});
