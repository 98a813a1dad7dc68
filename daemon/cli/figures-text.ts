// The document `figures/1` as text for people: one table per marker frequency, figures down, cuts across.
// Says nothing that the document does not hold.
import type { CutFigureKey, FigureEntry, FiguresDocument } from '../results/figures-document.ts';
import { printable, renderMegahertz, renderNumber, renderTable } from './terminal.ts';

const labels: Readonly<Record<CutFigureKey, [label: string, unit: string, digits: number]>> = {
  realizedGainDbi: ['realized gain', 'dBi', 2],
  gainDbi: ['gain', 'dBi', 2],
  peakDeg: ['peak at', '°', 1],
  halfPowerBeamwidthDeg: ['half-power beamwidth', '°', 2],
  tenDbBeamwidthDeg: ['−10 dB beamwidth', '°', 2],
  firstNullBeamwidthDeg: ['first-null beamwidth', '°', 1],
  squintDeg: ['squint', '°', 2],
  frontToBackDb: ['front-to-back', 'dB', 2],
  frontToRearDb: ['front-to-rear', 'dB', 2],
  firstSideLobeLeftDb: ['first side lobe left', 'dB', 1],
  firstSideLobeRightDb: ['first side lobe right', 'dB', 1],
  sideLobeLevelDb: ['side lobe level', 'dB', 1],
  circularityDb: ['circularity', 'dB', 1],
  closureDb: ['closure', 'dB', 3],
  driftDb: ['drift', 'dB', 3],
};

export function renderFigures(document: FiguresDocument): string {
  const parts = [renderHead(document)];
  const measured = document.cuts.filter((cut) => cut.anglesDeg.length > 0);
  for (const index of shownFrequencies(document)) {
    if (measured.length > 0) parts.push(renderFrequency({ ...document, cuts: measured }, index));
  }
  if (document.match) parts.push(renderMatch(document, document.match));
  parts.push(renderFlags(document));
  return parts.join('\n');
}

function renderHead(document: FiguresDocument): string {
  const { antenna, frequenciesHz } = document;
  const name = printable(`${antenna.name} ${antenna.revision}`.trim());
  const first = frequenciesHz[0];
  const last = frequenciesHz.at(-1);
  const band =
    first === undefined || last === undefined
      ? 'no samples'
      : `${frequenciesHz.length} frequencies, ${renderMegahertz(first)} to ${renderMegahertz(last)} MHz`;
  const { gainReference } = document;
  const gain = gainReference
    ? `gain from run ${gainReference.run} (${printable(gainReference.antenna)})`
    : 'no gain reference';
  const reason = document.reason ? `: ${printable(document.reason)}` : '';
  const origin = document.kind === 'reference' ? 'gain reference' : gain;
  return `run ${document.run}, ${name}, ${document.state}${reason}\n${band}; ${origin}\n`;
}

/** The markers, or the middle of the band where there are none. */
function shownFrequencies({ frequenciesHz, markersHz }: FiguresDocument): number[] {
  if (frequenciesHz.length === 0) return [];
  if (markersHz.length === 0) return [Math.floor(frequenciesHz.length / 2)];
  return [...new Set(markersHz.map((markerHz) => nearestIndex(frequenciesHz, markerHz)))];
}

function nearestIndex(frequenciesHz: readonly number[], wantedHz: number): number {
  let best = 0;
  for (const [index, frequencyHz] of frequenciesHz.entries()) {
    if (Math.abs(frequencyHz - wantedHz) < Math.abs((frequenciesHz[best] ?? 0) - wantedHz)) best = index;
  }
  return best;
}

function renderFrequency({ frequenciesHz, cuts }: FiguresDocument, index: number): string {
  const reasons: string[] = [];
  const shown = (entry: FigureEntry | undefined, digits: number): string => {
    if (!entry) return '';
    const reason = 'absent' in entry ? entry.absent : entry.note;
    if (reason !== undefined && !reasons.includes(reason)) reasons.push(reason);
    const mark = reason === undefined ? '' : `(${reasons.indexOf(reason) + 1})`;
    return 'absent' in entry ? mark : `${mark} ${renderEntry(entry, digits)}`.trim();
  };
  const rows = (Object.entries(labels) as [CutFigureKey, (typeof labels)[CutFigureKey]][])
    .filter(([key]) => cuts.some((cut) => cut.figures[key]))
    .map(([key, [label, unit, digits]]) => [
      label,
      ...cuts.map((cut) => shown(cut.figures[key]?.[index], digits)),
      unit,
    ]);
  const header = [
    `${renderMegahertz(frequenciesHz[index] ?? 0)} MHz`,
    ...cuts.map((cut) => `${printable(cut.name)} (${cut.plane === 'other' ? 'cut' : `${cut.plane}-plane`})`),
    '',
  ];
  const notes = reasons.map((reason, number) => `(${number + 1}) ${trueMinus(reason)}\n`).join('');
  return renderTable(header, rows) + notes;
}

/** The notes of the document are plain text; here minus signs are those of the numbers beside them. */
function trueMinus(text: string): string {
  return text.replace(/(?<![\w.])-(?=\d)/g, '−');
}

function renderEntry(entry: Exclude<FigureEntry, { absent: string }>, digits: number): string {
  const spread = entry.U === undefined ? '' : ` ± ${entry.U.toFixed(digits)}`;
  return `${boundSign(entry)}${renderNumber(entry.value, digits)}${spread}`;
}

function boundSign({ bound }: { bound?: 'upper' | 'lower' | undefined }): string {
  return bound === 'upper' ? '≤ ' : bound === 'lower' ? '≥ ' : '';
}

function renderMatch(document: FiguresDocument, match: NonNullable<FiguresDocument['match']>): string {
  const inMegahertz = (entry: FigureEntry): string => {
    if ('absent' in entry) return `none: ${entry.absent}`;
    const note = entry.note === undefined ? '' : ` (${entry.note})`;
    return `${boundSign(entry)}${(entry.value / 1e6).toFixed(2)} MHz${note}`;
  };
  const lines = [
    `best match   ${inMegahertz(match.bestMatchHz)}`,
    `resonance    ${inMegahertz(match.resonanceHz)}`,
  ];
  for (const index of shownFrequencies(document)) {
    const vswr = match.vswr[index];
    const returnLoss = match.returnLossDb[index];
    if (!vswr || !returnLoss) continue;
    const text = (entry: FigureEntry, digits: number): string =>
      'absent' in entry ? `none (${entry.absent})` : renderEntry(entry, digits);
    lines.push(
      `at ${renderMegahertz(document.frequenciesHz[index] ?? 0)} MHz   VSWR ${text(vswr, 2)}, return loss ${text(returnLoss, 2)} dB`,
    );
  }
  if (!('absent' in match.lengthScale) && match.markerHz !== undefined) {
    lines.push(
      `length scale ${match.lengthScale.value.toFixed(4)} brings the resonance to ${renderMegahertz(match.markerHz)} MHz`,
    );
  }
  return `match\n${lines.map((line) => `  ${line}\n`).join('')}`;
}

function renderFlags({ flags }: FiguresDocument): string {
  if (flags.length === 0) return 'no flags\n';
  return `flags\n${flags.map((flag) => `  ${flag.code}: ${printable(flag.text)}\n`).join('')}`;
}
