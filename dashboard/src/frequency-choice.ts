// The frequency that is looked at: a slider over the band, and a button for each marker frequency.
import { type ComponentChild, h } from 'preact';
import type { FiguresView } from './figures-file.ts';

export interface FrequencyChoiceProps {
  shown: FiguresView;
  frequencyIndex: number;
  choose: (frequencyIndex: number) => void;
}

export function FrequencyChoice({ shown, frequencyIndex, choose }: FrequencyChoiceProps): ComponentChild {
  const text = megahertz(shown.frequenciesHz[frequencyIndex] ?? 0);
  return h(
    'div',
    { class: 'frequency' },
    h('output', { for: 'frequency' }, text),
    h('input', {
      id: 'frequency',
      type: 'range',
      min: 0,
      max: shown.frequenciesHz.length - 1,
      value: frequencyIndex,
      'aria-label': 'frequency',
      'aria-valuetext': text,
      onInput: (event: Event) => choose(Number((event.currentTarget as HTMLInputElement).value)),
    }),
    shown.markersHz.length > 0 ? h(Markers, { shown, choose }) : null,
  );
}

function Markers({ shown, choose }: Omit<FrequencyChoiceProps, 'frequencyIndex'>): ComponentChild {
  return h(
    'div',
    { class: 'markers', role: 'group', 'aria-label': 'marker frequencies' },
    shown.markersHz.length > 1 ? 'markers' : 'marker',
    ...shown.markersHz.map((markerHz) =>
      h(
        'button',
        { type: 'button', onClick: () => choose(nearestIndex(shown.frequenciesHz, markerHz)) },
        `${Number((markerHz / 1e6).toFixed(3))} MHz`,
      ),
    ),
  );
}

/** The first marker's frequency, or the middle of the band where there is none. */
export function firstIndex({ frequenciesHz, markersHz }: FiguresView): number {
  const markerHz = markersHz[0];
  return markerHz === undefined
    ? Math.floor(frequenciesHz.length / 2)
    : nearestIndex(frequenciesHz, markerHz);
}

function nearestIndex(frequenciesHz: readonly number[], wantedHz: number): number {
  const distances = frequenciesHz.map((hz) => Math.abs(hz - wantedHz));
  return distances.indexOf(Math.min(...distances));
}

function megahertz(hz: number): string {
  return `${(hz / 1e6).toFixed(2)} MHz`;
}
