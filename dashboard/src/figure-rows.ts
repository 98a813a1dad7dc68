// The figures of one frequency as rows of text, with numbered notes for what a reader must know: why a
// figure is absent, and what was noted beside it. No DOM.
import type { CutView, Entry, MatchView } from './figures-file.ts';

export interface Cell {
  text: string;
  /** Number of a note, counted from 1. */
  mark?: number;
}

export interface FigureRow {
  label: string;
  cells: Cell[];
  unit: string;
}

export interface FigureRows {
  rows: FigureRow[];
  /** In the order of their numbers. */
  notes: string[];
}

const cutRows: readonly [key: string, label: string, unit: string, digits: number][] = [
  ['realizedGainDbi', 'realized gain', 'dBi', 2],
  ['gainDbi', 'gain', 'dBi', 2],
  ['peakDeg', 'peak at', '°', 1],
  ['halfPowerBeamwidthDeg', 'half-power beamwidth', '°', 2],
  ['tenDbBeamwidthDeg', '−10 dB beamwidth', '°', 2],
  ['firstNullBeamwidthDeg', 'first-null beamwidth', '°', 1],
  ['squintDeg', 'squint', '°', 2],
  ['frontToBackDb', 'front-to-back', 'dB', 2],
  ['frontToRearDb', 'front-to-rear', 'dB', 2],
  ['firstSideLobeLeftDb', 'first side lobe left', 'dB', 1],
  ['firstSideLobeRightDb', 'first side lobe right', 'dB', 1],
  ['sideLobeLevelDb', 'side lobe level', 'dB', 1],
  ['circularityDb', 'circularity', 'dB', 1],
  ['closureDb', 'closure', 'dB', 3],
  ['driftDb', 'drift', 'dB', 3],
];

/** Figures down, cuts across; a figure that no cut has is left out. */
export function cutFigureRows(cuts: readonly CutView[], frequencyIndex: number): FigureRows {
  const notes = new Notes();
  const rows = cutRows
    .filter(([key]) => cuts.some((cut) => cut.figures[key]))
    .map(([key, label, unit, digits]) => ({
      label,
      cells: cuts.map((cut) => notes.cell(cut.figures[key]?.[frequencyIndex], digits)),
      unit,
    }));
  return { rows, notes: notes.texts };
}

/** The first two rows follow the frequency, the others are of the whole band. */
export function matchRows(match: MatchView, frequencyIndex: number): FigureRows {
  const notes = new Notes();
  const row = (label: string, entry: Entry | undefined, digits: number, unit: string): FigureRow => ({
    label,
    cells: [notes.cell(entry, digits)],
    unit,
  });
  const rows = [
    row('VSWR', match.vswr[frequencyIndex], 2, ''),
    row('return loss', match.returnLossDb[frequencyIndex], 2, 'dB'),
    row('best match', inMegahertz(match.bestMatchHz), 3, 'MHz'),
    row('resonance', inMegahertz(match.resonanceHz), 3, 'MHz'),
    row('length scale', match.lengthScale, 4, ''),
  ];
  return { rows, notes: notes.texts };
}

/** A number with fixed digits and a true minus sign; what rounds to zero has no sign. */
export function renderNumber(value: number, digits: number): string {
  const text = value.toFixed(digits);
  return (Number(text) === 0 ? text.replace('-', '') : text).replace('-', '−');
}

function inMegahertz(entry: Entry): Entry {
  return entry.value === undefined ? entry : { ...entry, value: entry.value / 1e6 };
}

/** Numbers the notes as they come; the same words get the same number. */
class Notes {
  readonly texts: string[] = [];

  cell(entry: Entry | undefined, digits: number): Cell {
    const text = entryText(entry, digits);
    const note = entry?.absent ?? entry?.note;
    if (note === undefined) return { text };
    if (!this.texts.includes(note)) this.texts.push(note);
    return { text, mark: this.texts.indexOf(note) + 1 };
  }
}

function entryText(entry: Entry | undefined, digits: number): string {
  if (entry?.value === undefined) return '–';
  const sign = entry.bound === 'upper' ? '≤ ' : entry.bound === 'lower' ? '≥ ' : '';
  const spread = entry.U === undefined ? '' : ` ± ${entry.U.toFixed(digits)}`;
  return `${sign}${renderNumber(entry.value, digits)}${spread}`;
}
