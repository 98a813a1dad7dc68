// What the page shows, read back from it: the tables as text, the curves as points. Nothing here knows how
// the page comes by it.
import type { Page } from 'playwright-core';

export interface ShownCell {
  text: string;
  /** The note the cell points at. */
  note?: string;
}

/** Rows of a table by their label; one cell per column, the unit left out. */
export async function shownRows(page: Page, part: 'pattern' | 'match'): Promise<Map<string, ShownCell[]>> {
  const table = page.locator(`section.${part} table`);
  const notes = await page.locator(`section.${part} ol.notes li`).allTextContents();
  const rows = new Map<string, ShownCell[]>();
  for (const row of await table.locator('tbody tr').all()) {
    const texts = await row.locator('td:not(.unit)').allTextContents();
    rows.set(
      (await row.locator('th').textContent()) ?? '',
      texts.map((text) => cellOf(text, notes)),
    );
  }
  return rows;
}

/** A mark such as (2) stands before the figure. */
function cellOf(shown: string, notes: readonly string[]): ShownCell {
  const [, mark, text] = /^(?:\((\d+)\)\s*)?(.*)$/s.exec(shown.trim()) ?? [];
  const note = mark === undefined ? undefined : notes[Number(mark) - 1];
  return { text: text ?? '', ...(note === undefined ? {} : { note }) };
}

export interface Point {
  x: number;
  y: number;
}

/** The longest line of a colour in a plot, in pixels of that plot: the curve, not its sample in the legend. */
export async function drawnCurve(page: Page, part: 'pattern' | 'match', colour: string): Promise<Point[]> {
  const paths = page.locator(`section.${part} .plot svg path[fill="none"][stroke="${colour}" i]`);
  const shapes = await Promise.all((await paths.all()).map((path) => path.getAttribute('d')));
  const curves = shapes.map((shape) => {
    const numbers = (shape ?? '').match(/-?\d+(?:\.\d+)?(?:e-?\d+)?/g) ?? [];
    return Array.from({ length: numbers.length >> 1 }, (_, k) => ({
      x: Number(numbers[2 * k]),
      y: Number(numbers[2 * k + 1]),
    }));
  });
  return curves.reduce((longest, curve) => (curve.length > longest.length ? curve : longest), []);
}

export interface Straight {
  offset: number;
  slope: number;
  /** Largest distance of a point from the line. */
  worst: number;
}

/** Least squares of y over x: what the plot's scale is, and how far a point lies off it. */
export function straightLine(x: readonly number[], y: readonly number[]): Straight {
  const mean = (values: readonly number[]) => values.reduce((sum, value) => sum + value, 0) / values.length;
  const [meanX, meanY] = [mean(x), mean(y)];
  const slope =
    mean(x.map((value, k) => (value - meanX) * (y[k]! - meanY))) /
    mean(x.map((value) => (value - meanX) ** 2));
  const offset = meanY - slope * meanX;
  return { offset, slope, worst: Math.max(...x.map((value, k) => Math.abs(offset + slope * value - y[k]!))) };
}
