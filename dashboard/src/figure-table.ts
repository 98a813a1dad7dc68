// A table of figures with its notes below.
import { type ComponentChild, h } from 'preact';
import type { Cell, FigureRows } from './figure-rows.ts';

export interface FigureTableProps {
  /** Column headings, one per cell of a row: name and what stands under it. None where one column is plain. */
  heads: readonly [name: string, under: string][];
  figures: FigureRows;
}

export function FigureTable({ heads, figures }: FigureTableProps): ComponentChild {
  const head = h(
    'tr',
    {},
    h('td', {}),
    ...heads.map(([name, under]) => h('th', { scope: 'col' }, name, under ? h('small', {}, under) : null)),
    h('td', {}),
  );
  const body = figures.rows.map((row) =>
    h(
      'tr',
      {},
      h('th', { scope: 'row' }, row.label),
      ...row.cells.map((cell) => h('td', {}, mark(cell), cell.text)),
      h('td', { class: 'unit' }, row.unit),
    ),
  );
  return h(
    'div',
    { class: 'figures' },
    h('table', {}, heads.length > 0 ? h('thead', {}, head) : null, h('tbody', {}, ...body)),
    figures.notes.length > 0
      ? h('ol', { class: 'notes' }, ...figures.notes.map((note) => h('li', {}, note)))
      : null,
  );
}

function mark(cell: Cell): ComponentChild {
  return cell.mark === undefined ? null : h('sup', {}, `(${cell.mark})`);
}
