// The measured figures beside the scene's truth, as a table. Reads the document `figures/1` as any other
// program would, from its documentation.
import type { CutTruth } from '../scene/truth-cut.ts';
import type { BenchTruth } from '../simulated-bench.ts';

interface Entry {
  value?: number;
  bound?: 'upper' | 'lower';
  absent?: string;
}

export interface MeasuredFigures {
  frequenciesHz: number[];
  cuts: { name: string; figures: Record<string, Entry[]> }[];
  match?: { bestMatchHz: Entry; resonanceHz: Entry; vswr: Entry[] };
}

type Row = [
  name: string,
  measured: Entry | undefined,
  truth: number | undefined,
  unit: string,
  digits: number,
];

const cutRows: [
  key: string,
  label: string,
  of: (truth: CutTruth) => unknown,
  unit: string,
  digits: number,
][] = [
  ['realizedGainDbi', 'realized gain', (truth) => truth.realizedGainDbi, 'dBi', 3],
  ['peakDeg', 'peak at', (truth) => truth.peakDeg, '°', 2],
  ['halfPowerBeamwidthDeg', 'half-power beamwidth', (truth) => truth.halfPowerBeamwidthDeg, '°', 3],
  ['frontToBackDb', 'front-to-back', (truth) => truth.frontToBackDb, 'dB', 3],
  ['frontToRearDb', 'front-to-rear', (truth) => truth.frontToRearDb, 'dB', 3],
];

/** One table per frequency of the truth, and the match of the band. */
export function compareWithTruth(measured: MeasuredFigures, truth: BenchTruth): string {
  const blocks = truth.frequencies.map((at) => {
    const index = nearest(measured.frequenciesHz, at.frequencyHz);
    const rows = measured.cuts.flatMap(({ name, figures }) => {
      const own = name === 'elevation' ? at.elevation : at.azimuth;
      return cutRows.map(([key, label, of, unit, digits]): Row => {
        return [`${name} ${label}`, figures[key]?.[index], finite(of(own)), unit, digits];
      });
    });
    rows.push(['VSWR', measured.match?.vswr[index], at.vswr, '', 3]);
    return `${(at.frequencyHz / 1e6).toFixed(1)} MHz\n${table(rows)}`;
  });
  const match: Row[] = [
    ['best match', inMegahertz(measured.match?.bestMatchHz), megahertz(truth.match.bestMatchHz), 'MHz', 3],
    ['resonance', inMegahertz(measured.match?.resonanceHz), megahertz(truth.match.resonanceHz), 'MHz', 3],
  ];
  // An antenna given by a formula is matched everywhere: no best frequency is there to find, on either side.
  return `Measured, beside what the simulated scene really does, ${blocks.join('\n')}\nOver the band\n${table(match)}`;
}

function table(rows: readonly Row[]): string {
  const head = `${'figure'.padEnd(34)}${'measured'.padStart(10)}${'truth'.padStart(10)}${'difference'.padStart(12)}`;
  const lines = rows
    .filter(([, measured, truth]) => measured !== undefined || truth !== undefined)
    .map(([name, measured, truth, unit, digits]) => {
      const value = measured?.value;
      const sign = measured?.bound === 'lower' ? '≥ ' : measured?.bound === 'upper' ? '≤ ' : '';
      const known = value !== undefined && truth !== undefined && sign === '';
      const difference = known ? cell(value - truth, digits) : '–';
      const cells = [`${sign}${cell(value, digits)}`.padStart(10), cell(truth, digits).padStart(10)];
      cells.push(difference.padStart(12));
      return `${name.padEnd(34)}${cells.join('')}  ${unit}`.trimEnd();
    });
  return `${[head, ...lines].join('\n')}\n`;
}

function cell(value: number | undefined, digits: number): string {
  const text = value === undefined ? 'none' : value.toFixed(digits).replace(/^-(0\.?0*)$/, '$1');
  return text.replace('-', '−');
}

function finite(value: unknown): number | undefined {
  return typeof value === 'number' && Number.isFinite(value) ? value : undefined;
}

function megahertz(hz: number | undefined): number | undefined {
  return hz === undefined ? undefined : hz / 1e6;
}

function inMegahertz(entry: Entry | undefined): Entry | undefined {
  return entry?.value === undefined ? entry : { ...entry, value: entry.value / 1e6 };
}

function nearest(frequenciesHz: readonly number[], wantedHz: number): number {
  const distances = frequenciesHz.map((hz) => Math.abs(hz - wantedHz));
  return distances.indexOf(Math.min(...distances));
}
