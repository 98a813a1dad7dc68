// YAML text to plain values, with the line of every value kept for messages. Scalars stay the text that
// was written (YAML's failsafe schema): a revision 1.10 must not become 1.1, and numbers are read by
// quantity.ts. Refuses what a settings file has no use for: duplicate keys, deep nesting, alias bombs.
import {
  type Document,
  isAlias,
  isMap,
  isScalar,
  isSeq,
  Lexer,
  LineCounter,
  type Node,
  parseDocument,
} from 'yaml';
import { type FilePath, type FileProblem, fileInvalid, shown } from './file-problems.ts';

/** Longest file read, in characters and bytes. */
export const largestFile = 1_000_000;
const deepest = 20;
const longestLine = 1000;
const mostAliases = 100;

export interface YamlTree {
  /** Mappings, lists and strings. */
  value: unknown;
  /** Line of the value there or, for `key` and for collections, of its key; of what encloses it when absent. */
  lineOf(path: FilePath, at?: 'key' | 'value'): number;
  /** What stands there, for `found …`. */
  found(path: FilePath): string;
}

/** Throws FILE_INVALID. `file` is only for messages. */
export function parseYaml(text: string, file: string): YamlTree {
  const unfit = text.length > largestFile ? tooLarge : unfitForParser(text);
  if (unfit) throw fileInvalid(file, [unfit]);
  const lines = new LineCounter();
  const doc = parsed(text, file, lines);
  // What is missing at the end is missing in the last line that holds anything.
  const end = Math.max(0, text.trimEnd().length - 1);
  const lineAt = (offset: number): number => Math.max(1, lines.linePos(Math.min(offset, end)).line);
  const slips = [...doc.errors, ...doc.warnings].map((slip) => ({
    line: lineAt(slip.pos[0]),
    path: [],
    text: yamlSlip(slip.code, slip.message),
  }));
  const problems = slips.length > 0 ? slips : structureProblems(doc, lineAt);
  if (problems.length > 0) throw fileInvalid(file, problems);
  if (!isMap(doc.contents)) throw fileInvalid(file, [notAMapping(doc.contents, lineAt)]);
  return {
    value: plainValue(doc, file),
    lineOf: (path, at = 'value') => lineAt(offsetOf(doc, path, at)),
    found: (path) => foundText(walk(doc, path)),
  };
}

export const tooLarge: FileProblem = { line: 1, path: [], text: 'expected at most 1 MB of text; found more' };

/**
 * What must not reach the parser, which recurses over nesting: thousands of levels end the process, not
 * merely the call. Brackets are counted by its own lexer; other nesting cannot go deeper than a line is long.
 */
function unfitForParser(text: string): FileProblem | undefined {
  const long = text.split('\n').findIndex((line) => line.length > longestLine);
  if (long >= 0) {
    const expected = `expected lines of at most ${longestLine} characters; found a longer one`;
    return { line: long + 1, path: [], text: expected };
  }
  let depth = 0;
  let line = 1;
  for (const token of new Lexer().lex(text)) {
    if (token === '[' || token === '{') depth += 1;
    else if (token === ']' || token === '}') depth -= 1;
    else if (token.includes('\n')) line += token.split('\n').length - 1;
    if (depth > deepest) return { line, path: [], text: tooDeep };
  }
  return undefined;
}

const tooDeep = `expected at most ${deepest} levels; found more`;

function parsed(text: string, file: string, lineCounter: LineCounter): Document.Parsed {
  try {
    // Duplicate keys are looked for below: the library compares every key with every other.
    return parseDocument(text, { schema: 'failsafe', lineCounter, uniqueKeys: false, prettyErrors: false });
  } catch (cause) {
    throw fileInvalid(
      file,
      [{ line: 1, path: [], text: 'expected YAML; found text that cannot be read' }],
      cause,
    );
  }
}

function plainValue(doc: Document.Parsed, file: string): unknown {
  try {
    return doc.toJS({ maxAliasCount: mostAliases });
  } catch (cause) {
    const unknown = cause instanceof Error && cause.message.startsWith('Unresolved');
    const text = unknown
      ? 'expected anchors to stand before their use; found the use of an unknown one'
      : `expected at most ${mostAliases} values through anchors; found more`;
    throw fileInvalid(file, [{ line: 1, path: [], text }], cause);
  }
}

function yamlSlip(code: string, message: string): string {
  if (code === 'TAB_AS_INDENT') return 'expected spaces at the start of the line; found a tab';
  if (code === 'MULTIPLE_DOCS') return 'expected one document; found a second one after ---';
  return `expected YAML; ${shown(message, 160)}`;
}

function notAMapping(contents: Node | null, lineAt: (offset: number) => number): FileProblem {
  const text = `expected keys with values; found ${foundText(contents)}`;
  return { line: contents?.range ? lineAt(contents.range[0]) : 1, path: [], text };
}

/** Duplicate keys and deep nesting, without recursion. */
function structureProblems(doc: Document.Parsed, lineAt: (offset: number) => number): FileProblem[] {
  const problems: FileProblem[] = [];
  const open: { node: unknown; path: FilePath }[] = [{ node: doc.contents, path: [] }];
  for (let at = open.pop(); at !== undefined; at = open.pop()) {
    const { node, path } = at;
    if (!isMap(node) && !isSeq(node)) continue;
    if (path.length >= deepest) {
      const line = node.range ? lineAt(node.range[0]) : 1;
      return [{ line, path: path.slice(0, 3), text: tooDeep }];
    }
    if (isSeq(node)) {
      for (const [i, item] of node.items.entries()) open.push({ node: item, path: [...path, i] });
      continue;
    }
    const seen = new Map<string, number>();
    for (const { key, value } of node.items) {
      const name = isScalar(key) ? String(key.value) : undefined;
      const line = isScalar(key) && key.range ? lineAt(key.range[0]) : 1;
      if (name === undefined) {
        problems.push({
          line: lineOfNode(key, lineAt),
          path,
          text: 'expected a word as key; found something else',
        });
        continue;
      }
      const first = seen.get(name);
      if (first === undefined) seen.set(name, line);
      else
        problems.push({
          line,
          path,
          text: `key \`${shown(name, 40)}\` is given twice, first in line ${first}`,
        });
      open.push({ node: value, path: [...path, name] });
    }
  }
  return problems;
}

function lineOfNode(node: unknown, lineAt: (offset: number) => number): number {
  const range = (node as Node | null)?.range;
  return range ? lineAt(range[0]) : 1;
}

interface Step {
  key?: Node;
  value: Node | null;
}

/** The nodes along a path as far as it exists; the first is the whole document. */
function steps(doc: Document.Parsed, path: FilePath): Step[] {
  const taken: Step[] = [{ value: doc.contents }];
  for (const part of path) {
    let node = taken.at(-1)?.value ?? null;
    if (isAlias(node)) node = (node.resolve(doc) as Node | undefined) ?? null;
    if (isMap(node)) {
      const pair = node.items.find(({ key }) => isScalar(key) && key.value === String(part));
      if (!pair) break;
      taken.push({ key: pair.key as Node, value: pair.value as Node | null });
    } else if (isSeq(node) && typeof part === 'number' && part < node.items.length) {
      taken.push({ value: node.items[part] as Node | null });
    } else break;
  }
  return taken;
}

function walk(doc: Document.Parsed, path: FilePath): Node | null {
  const taken = steps(doc, path);
  const node = taken.length === path.length + 1 ? (taken.at(-1)?.value ?? null) : null;
  return isAlias(node) ? ((node.resolve(doc) as Node | undefined) ?? null) : node;
}

function offsetOf(doc: Document.Parsed, path: FilePath, at: 'key' | 'value'): number {
  const { key, value } = steps(doc, path).at(-1)!;
  const written = isScalar(value) && value.source !== '';
  const node = at === 'value' && written ? value : (key ?? value);
  return node?.range?.[0] ?? 0;
}

function foundText(node: Node | null): string {
  if (isMap(node)) return node.items.length > 0 ? 'keys with values' : 'an empty mapping';
  if (isSeq(node)) return node.items.length > 0 ? 'a list' : 'an empty list';
  const text = isScalar(node) ? String(node.value ?? '') : '';
  if (text === '') return 'nothing';
  return /^[+-]?(\d+\.?\d*|\.\d+)$/.test(text) && text.length < 40 ? text : `"${shown(text, 40)}"`;
}
