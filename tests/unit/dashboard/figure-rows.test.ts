// Figures as rows of text: digits, signs, bounds, intervals, and numbered notes.
import { describe, expect, it } from 'vitest';
import { cutFigureRows, matchRows, renderNumber } from '../../../dashboard/src/figure-rows.ts';
import type { CutView, Entry } from '../../../dashboard/src/figures-file.ts';

function cut(figures: Record<string, Entry[]>): CutView {
  return { name: 'azimuth', plane: 'H', anglesDeg: [], levelDb: [], figures };
}

const cellsOf = (entry: Entry) => cutFigureRows([cut({ frontToBackDb: [entry] })], 0).rows[0]?.cells[0];

describe('figures as text', () => {
  it.each<[Entry, string]>([
    [{ value: 17.617 }, '17.62'],
    [{ value: -17.617 }, '−17.62'],
    [{ value: 70, bound: 'lower' }, '≥ 70.00'],
    [{ value: -20.5, bound: 'upper' }, '≤ −20.50'],
    [{ value: 17.617, U: 0.6 }, '17.62 ± 0.60'],
    [{}, '–'],
  ])('%j', (entry, text) => {
    expect(cellsOf(entry)).toEqual({ text });
  });

  it('has no sign on what rounds to zero', () => {
    expect(renderNumber(-0.004, 2)).toBe('0.00');
    expect(renderNumber(-0.006, 2)).toBe('−0.01');
    expect(renderNumber(-0, 1)).toBe('0.0');
  });

  it('takes the entry of the frequency, and leaves out figures no cut has', () => {
    const cuts = [cut({ peakDeg: [{ value: 1 }, { value: 2 }] }), cut({})];
    expect(cutFigureRows(cuts, 1)).toEqual({
      rows: [{ label: 'peak at', cells: [{ text: '2.0' }, { text: '–' }], unit: '°' }],
      notes: [],
    });
  });

  it('numbers notes as they come and gives the same words one number', () => {
    const because = 'the cut is no full turn';
    const { rows, notes } = cutFigureRows(
      [
        cut({ peakDeg: [{ value: 1, note: 'as sampled' }], closureDb: [{ absent: because }] }),
        cut({ circularityDb: [{ absent: because }] }),
      ],
      0,
    );
    expect(notes).toEqual(['as sampled', because]);
    const marks = Object.fromEntries(rows.map(({ label, cells }) => [label, cells.map(({ mark }) => mark)]));
    expect(marks).toEqual({
      'peak at': [1, undefined],
      circularity: [undefined, 2],
      closure: [2, undefined],
    });
    expect(rows.find(({ label }) => label === 'closure')?.cells[0]).toEqual({ text: '–', mark: 2 });
  });

  it('gives frequencies of the match in megahertz', () => {
    const match = {
      vswr: [{ value: 1.2239 }],
      returnLossDb: [{ value: 19.918 }],
      bestMatchHz: { value: 858_638_000 },
      resonanceHz: { absent: 'stays inductive' },
      lengthScale: { value: 0.98667 },
    };
    const { rows, notes } = matchRows(match, 0);
    expect(rows.map(({ label, cells, unit }) => `${label} ${cells[0]?.text} ${unit}`.trim())).toEqual([
      'VSWR 1.22',
      'return loss 19.92 dB',
      'best match 858.638 MHz',
      'resonance – MHz',
      'length scale 0.9867',
    ]);
    expect(notes).toEqual(['stays inductive']);
  });
});
