// The commands the instrument knows and how a header finds its command: long and short forms, optional
// nodes, numeric suffixes, and the path that a compound message carries along.
//
// A pattern is written as in a manual: `[SENSe#]:FREQuency:STARt`. Brackets: may be left out; `#`: takes a
// numeric suffix (missing means 1), handed to the command in order.
import { Refusal } from './error-queue.ts';
import type { Unit } from './message-units.ts';
import { isWord } from './parameter-values.ts';

export type Answer = string | Uint8Array;

export interface Call {
  parameters: readonly string[];
  /** Suffixes of the `#` nodes, in the pattern's order. */
  suffixes: readonly number[];
}

export interface Command {
  pattern: string;
  /** Least and most parameters of the setting; default none. */
  takes?: readonly [number, number];
  set?: (call: Call) => void | Promise<void>;
  /** Least and most parameters of the query; default none. */
  asks?: readonly [number, number];
  query?: (call: Call) => Answer | Promise<Answer>;
}

interface Node {
  word: string;
  optional: boolean;
  numbered: boolean;
}

interface Entry {
  nodes: readonly Node[];
  command: Command;
}

export interface Found {
  command: Command;
  suffixes: readonly number[];
  /** Where the next unit of the message starts from. */
  path: readonly string[];
}

export class CommandTree {
  readonly #entries: readonly Entry[];

  constructor(commands: readonly Command[]) {
    this.#entries = commands.map((command) => ({ nodes: nodesOf(command.pattern), command }));
  }

  /** Throws Refusal −113 for an unknown header, −114 for a suffix where none belongs. */
  find(unit: Unit, path: readonly string[]): Found {
    const written = unit.common || unit.absolute ? unit.nodes : [...path, ...unit.nodes];
    let misplacedSuffix = false;
    for (const { nodes, command } of this.#entries) {
      const known = unit.query ? command.query : command.set;
      if (!known) continue;
      const suffixes = match(nodes, written);
      if (suffixes === 'misplaced') misplacedSuffix = true;
      else if (suffixes) return { command, suffixes, path: unit.common ? path : written.slice(0, -1) };
    }
    throw new Refusal(misplacedSuffix ? -114 : -113, unit.text);
  }
}

function nodesOf(pattern: string): Node[] {
  return [...pattern.matchAll(/(\[?):?(\*?[A-Za-z]+)(#?)\]?/g)].map(([, bracket, word, number]) => ({
    word: word!,
    optional: bracket === '[',
    numbered: number === '#',
  }));
}

/** Suffixes in order where the header fits; 'misplaced' where only a suffix is wrong. */
function match(nodes: readonly Node[], written: readonly string[]): number[] | 'misplaced' | undefined {
  const [node, ...others] = nodes;
  if (!node) return written.length === 0 ? [] : undefined;
  const first = written[0];
  let misplaced = false;
  if (first !== undefined) {
    const [, word, digits] = /^(.*?)(\d*)$/.exec(first)!;
    if (isWord(word!, node.word)) {
      const rest = match(others, written.slice(1));
      if (rest === 'misplaced' || (rest && digits !== '' && !node.numbered)) misplaced = true;
      else if (rest) return node.numbered ? [digits === '' ? 1 : Number(digits), ...rest] : rest;
    }
  }
  if (node.optional) {
    const rest = match(others, written);
    if (rest && rest !== 'misplaced') return node.numbered ? [1, ...rest] : rest;
    misplaced ||= rest === 'misplaced';
  }
  return misplaced ? 'misplaced' : undefined;
}
