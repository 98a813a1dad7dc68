// The grammar of one message: units parted by semicolons, each a header and parameters parted by commas.
// Says what was written, not whether such a command exists.
import { Refusal } from './error-queue.ts';

export interface Unit {
  /** As received, for the remark of an error. */
  text: string;
  /** Mnemonics as written, suffix digits included; one with a star for common commands. */
  nodes: readonly string[];
  common: boolean;
  /** A leading colon: from the root. */
  absolute: boolean;
  query: boolean;
  parameters: readonly string[];
}

const header = /^(?:(\*[A-Za-z]+)|(:?)([A-Za-z][A-Za-z0-9_]*(?::[A-Za-z][A-Za-z0-9_]*)*))(\?)?/;
const longestMnemonic = 12;

/** Texts of the units of a message; semicolons inside strings do not part. */
export function splitUnits(message: string): string[] {
  return splitOutsideStrings(message, ';')
    .map((text) => text.trim())
    .filter((text) => text !== '');
}

/** Throws Refusal −101, −102, −103, −109, −112 or −151. */
export function parseUnit(text: string): Unit {
  const match = header.exec(text);
  if (!match) throw new Refusal(/^[:*]/.test(text) ? -102 : -101);
  const [whole, common, colon, path, question] = match;
  const rest = text.slice(whole.length);
  if (rest !== '' && !/^\s/.test(rest)) throw new Refusal(/^[,;"']/.test(rest) ? -103 : -101);
  const nodes = common ? [common] : path!.split(':');
  if (nodes.some((node) => node.replace(/\d+$/, '').length > longestMnemonic)) throw new Refusal(-112);
  return {
    text,
    nodes,
    common: common !== undefined,
    absolute: colon === ':',
    query: question === '?',
    parameters: parseParameters(rest.trim()),
  };
}

function parseParameters(text: string): string[] {
  if (text === '') return [];
  const parameters = splitOutsideStrings(text, ',').map((parameter) => parameter.trim());
  if (parameters.includes('')) throw new Refusal(-109);
  return parameters;
}

function splitOutsideStrings(text: string, separator: string): string[] {
  const parts = [''];
  let quote: string | undefined;
  for (const character of text) {
    if (quote === undefined && character === separator) {
      parts.push('');
      continue;
    }
    if (quote === character) quote = undefined;
    else if (quote === undefined && (character === '"' || character === "'")) quote = character;
    parts[parts.length - 1] += character;
  }
  if (quote !== undefined) throw new Refusal(-151);
  return parts;
}
