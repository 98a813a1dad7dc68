// How results look in a terminal: tables, durations, numbers. Text only; no decision about what to say.

/** Columns padded to their widest cell; numbers to the right, words to the left. */
export function renderTable(header: readonly string[], rows: readonly (readonly string[])[]): string {
  const widths = header.map((title, column) =>
    Math.max(title.length, ...rows.map((row) => (row[column] ?? '').length)),
  );
  const numeric = header.map((_, column) =>
    rows.every((row) => /^[<>≤≥+−-]?\s?[\d.,]*(\s?±.*)?$/.test(row[column] ?? '')),
  );
  const line = (cells: readonly string[]): string =>
    cells
      .map((cell, column) => {
        const width = widths[column] ?? 0;
        return numeric[column] ? cell.padStart(width) : cell.padEnd(width);
      })
      .join('  ')
      .trimEnd();
  return `${[line(header), ...rows.map(line)].join('\n')}\n`;
}

/** `2 h 05 min`, `3 min 20 s`, `12 s`, `0.2 s`. */
export function renderDuration(ms: number): string {
  if (ms > 0 && ms < 950) return `${(ms / 1000).toFixed(1)} s`;
  const seconds = Math.max(0, Math.round(ms / 1000));
  const minutes = Math.floor(seconds / 60);
  const hours = Math.floor(minutes / 60);
  if (hours > 0) return `${hours} h ${String(minutes % 60).padStart(2, '0')} min`;
  if (minutes > 0) return `${minutes} min ${String(seconds % 60).padStart(2, '0')} s`;
  return `${seconds} s`;
}

/** Fixed digits with a true minus sign; what rounds to zero has none. */
export function renderNumber(value: number, digits: number): string {
  const text = value.toFixed(digits);
  return Number(text) === 0 ? text.replace('-', '') : text.replace('-', '−');
}

export function renderMegahertz(frequencyHz: number): string {
  const text = (frequencyHz / 1e6).toFixed(3);
  return text.replace(/\.?0+$/, '');
}

/** Control characters of names and texts never reach the terminal as such. */
export function printable(text: string): string {
  return text.replace(/[\u0000-\u001f\u007f-\u009f]/g, '?');
}
