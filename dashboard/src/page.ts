// The page of this version: shows one figures file, chosen or dropped, without any server. Live runs come
// with the gateway.
import { computed, signal } from '@preact/signals';
import { type ComponentChild, h, render } from 'preact';
import { levelOverFrequencyOption } from '../plots/level-over-frequency.ts';
import { darkColours, lightColours } from '../plots/palette.ts';
import { polarPatternOption } from '../plots/polar-pattern.ts';
import { type Entry, type FiguresView, readFiguresFile } from './figures-file.ts';
import { Plot } from './plot.ts';
import './page.css';

const view = signal<FiguresView | undefined>(undefined);
const problem = signal('');
const frequencyIndex = signal(0);
const dark = matchMedia('(prefers-color-scheme: dark)');
const colours = signal(dark.matches ? darkColours : lightColours);
dark.addEventListener('change', () => {
  colours.value = dark.matches ? darkColours : lightColours;
});

const polar = computed(() => {
  const shown = view.value;
  const curves = (shown?.cuts ?? []).map((cut) => ({
    name: cut.name,
    anglesDeg: cut.anglesDeg,
    levelDb: cut.levelDb[frequencyIndex.value] ?? [],
  }));
  return polarPatternOption(curves, 40, colours.value);
});

const match = computed(() => {
  const shown = view.value;
  const levels = (shown?.returnLossDb ?? []).map((entry) => entry.value);
  return levelOverFrequencyOption(
    'return loss',
    shown?.frequenciesHz ?? [],
    levels,
    shown?.markersHz ?? [],
    colours.value,
  );
});

async function open(file: File | undefined): Promise<void> {
  if (!file) return;
  const read = readFiguresFile(await file.text());
  if ('problem' in read) {
    problem.value = read.problem;
    return;
  }
  problem.value = '';
  frequencyIndex.value = nearest(read.frequenciesHz, read.markersHz[0]);
  view.value = read;
}

function nearest(frequenciesHz: readonly number[], wantedHz: number | undefined): number {
  if (wantedHz === undefined) return Math.floor(frequenciesHz.length / 2);
  const distances = frequenciesHz.map((hz) => Math.abs(hz - wantedHz));
  return distances.indexOf(Math.min(...distances));
}

const rows: [key: string, label: string, unit: string, digits: number][] = [
  ['realizedGainDbi', 'realized gain', 'dBi', 2],
  ['peakDeg', 'peak at', '°', 1],
  ['halfPowerBeamwidthDeg', 'half-power beamwidth', '°', 1],
  ['frontToBackDb', 'front-to-back', 'dB', 1],
  ['frontToRearDb', 'front-to-rear', 'dB', 1],
  ['sideLobeLevelDb', 'side lobe level', 'dB', 1],
  ['closureDb', 'closure', 'dB', 2],
  ['driftDb', 'drift', 'dB', 2],
];

function entryText(entry: Entry | undefined, digits: number): string {
  if (entry?.value === undefined) return '–';
  const sign = entry.bound === 'upper' ? '≤ ' : entry.bound === 'lower' ? '≥ ' : '';
  return `${sign}${entry.value.toFixed(digits).replace('-', '−')}`;
}

function Chooser(): ComponentChild {
  return h(
    'label',
    { class: 'chooser' },
    'Open a figures file ',
    h('input', {
      type: 'file',
      accept: '.json,application/json',
      onChange: (event: Event) => open((event.currentTarget as HTMLInputElement).files?.[0]),
    }),
  );
}

function FigureTable({ shown }: { shown: FiguresView }): ComponentChild {
  const index = frequencyIndex.value;
  const head = h(
    'tr',
    {},
    h('th', {}),
    ...shown.cuts.map((cut) => h('th', { scope: 'col' }, cut.name)),
    h('th', {}),
  );
  const body = rows
    .filter(([key]) => shown.cuts.some((cut) => cut.figures[key]))
    .map(([key, label, unit, digits]) =>
      h(
        'tr',
        {},
        h('th', { scope: 'row' }, label),
        ...shown.cuts.map((cut) => {
          const entry = cut.figures[key]?.[index];
          return h('td', { title: entry?.absent ?? '' }, entryText(entry, digits));
        }),
        h('td', { class: 'unit' }, unit),
      ),
    );
  return h('table', {}, h('thead', {}, head), h('tbody', {}, ...body));
}

function FrequencyChoice({ shown }: { shown: FiguresView }): ComponentChild {
  const hz = shown.frequenciesHz[frequencyIndex.value] ?? 0;
  return h(
    'label',
    { class: 'frequency' },
    h('span', {}, `${(hz / 1e6).toFixed(2)} MHz`),
    h('input', {
      type: 'range',
      min: 0,
      max: shown.frequenciesHz.length - 1,
      value: frequencyIndex.value,
      'aria-label': 'frequency',
      onInput: (event: Event) => {
        frequencyIndex.value = Number((event.currentTarget as HTMLInputElement).value);
      },
    }),
  );
}

function RunView({ shown }: { shown: FiguresView }): ComponentChild {
  return h(
    'div',
    { class: 'run' },
    h('h2', {}, `Run ${shown.run}: ${shown.title}`),
    h('p', {}, shown.state, shown.flags.length === 0 ? ', no flags' : ''),
    ...shown.flags.map((flag) => h('p', { class: 'flag' }, flag)),
    h(FrequencyChoice, { shown }),
    h(
      'div',
      { class: 'panels' },
      h(Plot, { option: polar.value, label: 'polar pattern, dB relative to the highest level' }),
      h(FigureTable, { shown }),
      h(Plot, { option: match.value, label: 'return loss over frequency' }),
    ),
  );
}

function Page(): ComponentChild {
  const shown = view.value;
  return h(
    'div',
    {
      onDragOver: (event: DragEvent) => event.preventDefault(),
      onDrop: (event: DragEvent) => {
        event.preventDefault();
        void open(event.dataTransfer?.files[0]);
      },
    },
    h('header', {}, h('h1', {}, 'Nightcut'), h(Chooser, {})),
    problem.value ? h('p', { class: 'problem', role: 'alert' }, problem.value) : null,
    shown
      ? h(RunView, { shown })
      : h(
          'p',
          { class: 'empty' },
          'Nothing open yet. Write a file with ',
          h('code', {}, 'nightcut show RUN --json --levels > run.json'),
          ' and open or drop it here.',
        ),
  );
}

render(h(Page, {}), document.getElementById('page')!);
