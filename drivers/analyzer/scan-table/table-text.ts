// Lines of an instrument that answers in text to values, pure: the table of a scan, and single answers.
import { DriverError } from '../../errors.ts';
import { requireAxis } from '../scpi-setup.ts';
import type { TraceColumn } from '../scpi-templates.ts';
import { decodeNumber, excerpt } from '../scpi-values.ts';

/** Lines of an answer without those that repeat the question (an echo) and without empty ones. */
export function linesOf(text: string, question: string): string[] {
  const lines = text
    .split(/[\r\n]+/)
    .map((line) => line.trim())
    .filter((line) => line !== '');
  return lines[0] === question.trim() ? lines.slice(1) : lines;
}

/**
 * One line for each point, numbers parted by white space, commas or semicolons; returns (re, im, re, im …).
 * Throws ANALYZER_BAD_ANSWER for another shape, ANALYZER_SETTING_DIFFERS for another frequency.
 */
export function decodeTable(
  lines: readonly string[],
  columns: readonly TraceColumn[],
  frequenciesHz: Float64Array,
): Float64Array {
  if (lines.length !== frequenciesHz.length) {
    throw badTable(`${lines.length} lines instead of ${frequenciesHz.length}`, lines[0] ?? '');
  }
  const trace = new Float64Array(2 * lines.length);
  const axis = new Float64Array(lines.length);
  for (const [i, line] of lines.entries()) {
    const numbers = line.split(/\s*[,;]\s*|\s+/).map(decodeNumber);
    if (numbers.length !== columns.length) {
      throw badTable(`line ${i + 1} has ${numbers.length} numbers instead of ${columns.length}`, line);
    }
    trace[2 * i] = numbers[columns.indexOf('re')]!;
    trace[2 * i + 1] = numbers[columns.indexOf('im')]!;
    axis[i] = numbers[columns.indexOf('frequency')] ?? frequenciesHz[i]!;
  }
  requireAxis(frequenciesHz, axis);
  return trace;
}

function badTable(because: string, line: string): DriverError {
  return new DriverError('ANALYZER_BAD_ANSWER', `the table of a scan: ${because} ('${excerpt(line)}')`, {
    line: excerpt(line),
  });
}

/** The first number in a short answer: `1000`, `bandwidth 1000 Hz`. Throws ANALYZER_BAD_ANSWER. */
export function numberIn(lines: readonly string[]): number {
  const found = /[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?/.exec(lines.join(' '));
  if (found) return Number(found[0]);
  throw new DriverError('ANALYZER_BAD_ANSWER', `'${excerpt(lines.join(' '))}' holds no number`, {
    answer: excerpt(lines.join(' ')),
  });
}
