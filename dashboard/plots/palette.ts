// Colours of the plots: one per cut, told apart also by line style, readable in light and dark.

export interface PlotColours {
  text: string;
  grid: string;
}

export const lightColours: PlotColours = { text: '#27313a', grid: '#d5dbe0' };
export const darkColours: PlotColours = { text: '#dce3e8', grid: '#3b454d' };

export interface CutStyle {
  color: string;
  /** As the plot library takes it: a name, or lengths of line and gap in pixels. */
  type: 'solid' | 'dashed' | 'dotted' | number[];
}

const first: CutStyle = { color: '#c2571a', type: 'solid' };

export const cutStyles: readonly CutStyle[] = [
  first,
  { color: '#2a7f8e', type: 'dashed' },
  { color: '#8566b5', type: 'dotted' },
  { color: '#5b7d2e', type: [10, 3, 2, 3] },
  { color: '#b3476d', type: [14, 4] },
];

/** The style of the n-th cut, counted from 0; beyond the last they begin again. */
export function cutStyle(index: number): CutStyle {
  return cutStyles[index % cutStyles.length] ?? first;
}

/** A number as an axis prints it, with a true minus sign. */
export function axisNumber(value: number): string {
  return String(value).replace('-', '−');
}

/** What the plot library is handed: plain data, no DOM. */
export type PlotOption = Record<string, unknown>;
