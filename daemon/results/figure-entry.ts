// How a figure of the mathematics is written into the document.
import type { Figure } from '../pattern/figure.ts';
import type { FigureEntry } from './figures-document.ts';

/** As the document writes a figure. */
export function entryOf(figure: Figure): FigureEntry {
  switch (figure.kind) {
    case 'value':
      return { value: figure.value, ...noteOf(figure) };
    case 'bound':
      return { value: figure.value, bound: figure.bound, ...noteOf(figure) };
    case 'absent':
      return { absent: figure.because };
  }
}

function noteOf({ note }: { note?: string }): { note?: string } {
  return note === undefined ? {} : { note };
}
