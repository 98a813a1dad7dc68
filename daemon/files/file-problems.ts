// What is wrong with a written file, as one line an operator can act on:
// `range.yaml:12: analyzer.trace.format: expected one of real64, real32, ascii; found "real"`.
// Several problems become one error: the first in the order of lines speaks, all stand in its facts.
import { DaemonError } from '../errors.ts';

export type FilePath = readonly (string | number)[];

export interface FileProblem {
  /** 1 for the first line. */
  line: number;
  /** Where in the tree; empty for the whole file. */
  path: FilePath;
  text: string;
}

/** So many problems are told in `facts.problems`; the rest only counts. */
const toldAtMost = 20;

/**
 * FILE_INVALID over at least one problem. Facts: `file`, `line` of the first, `count` of all, and
 * `problems`, up to 20 lines in the form of the message, parted by line feeds.
 */
export function fileInvalid(file: string, problems: readonly FileProblem[], cause?: unknown): DaemonError {
  const sorted = [...problems].sort((a, b) => a.line - b.line);
  const lines = sorted.slice(0, toldAtMost).map((problem) => problemLine(file, problem));
  const more = sorted.length > 1 ? ` (and ${sorted.length - 1} more)` : '';
  const facts = { file, line: sorted[0]?.line ?? 1, count: sorted.length, problems: lines.join('\n') };
  return new DaemonError('FILE_INVALID', `${lines[0]}${more}`, facts, cause);
}

export function problemLine(file: string, problem: FileProblem): string {
  const where = problem.path.length > 0 ? `${pathText(problem.path)}: ` : '';
  return `${shown(file, 200)}:${problem.line}: ${where}${problem.text}`;
}

/** `cuts[0].step` */
export function pathText(path: FilePath): string {
  return path
    .map((part, i) => (typeof part === 'number' ? `[${part}]` : `${i > 0 ? '.' : ''}${shown(part, 40)}`))
    .join('');
}

/** Foreign text inside a line of ours: no line ends, no control or direction characters, not too long. */
export function shown(text: string, longest: number): string {
  const short = text.length > longest ? `${text.slice(0, longest)}…` : text;
  return short.replace(/[\p{Cc}\p{Cf}\p{Zl}\p{Zp}\p{Cs}]/gu, (sign) => {
    return `\\u${(sign.codePointAt(0) ?? 0).toString(16).padStart(4, '0')}`;
  });
}
