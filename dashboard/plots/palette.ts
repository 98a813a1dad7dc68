// Colours of the plots: one per cut, told apart also by line style, readable in light and dark.

export interface PlotColours {
  text: string;
  grid: string;
}

export const lightColours: PlotColours = { text: '#27313a', grid: '#d5dbe0' };
export const darkColours: PlotColours = { text: '#dce3e8', grid: '#3b454d' };

export const cutStyles: readonly { color: string; type: 'solid' | 'dashed' | 'dotted' }[] = [
  { color: '#c2571a', type: 'solid' },
  { color: '#2a7f8e', type: 'dashed' },
  { color: '#7a5ca8', type: 'dotted' },
];

/** What the plot library is handed: plain data, no DOM. */
export type PlotOption = Record<string, unknown>;
