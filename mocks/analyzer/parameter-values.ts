// What a parameter's text means to the instrument: numbers with units, limits by name, booleans, words.
import { Refusal } from './error-queue.ts';

export type Unitage = 'frequency' | 'time' | 'level' | 'none';

/** In these two units M means mega, everywhere else milli (SCPI-1999, suffix multipliers). */
const factors: Readonly<Record<Unitage, Readonly<Record<string, number>>>> = {
  frequency: { HZ: 1, KHZ: 1e3, MHZ: 1e6, MAHZ: 1e6, GHZ: 1e9, UHZ: 1e-6 },
  time: { S: 1, MS: 1e-3, US: 1e-6, NS: 1e-9, KS: 1e3, MAS: 1e6 },
  level: { DBM: 1, DB: 1 },
  none: {},
};

const decimal = /^([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)\s*([A-Za-z]+)?$/;
const nonDecimal = /^#(?:H([0-9A-F]+)|Q([0-7]+)|B([01]+))$/i;

export interface Limits {
  min: number;
  max: number;
  def: number;
}

/** A number within limits, or one of them by name. Throws −104, −121, −131, −138 or −222. */
export function numberOf(text: string, unitage: Unitage, limits: Limits): number {
  const named = limitOf(text, limits);
  if (named !== undefined) return named;
  const value = plainNumber(text, unitage);
  if (value < limits.min || value > limits.max) throw new Refusal(-222);
  return value;
}

/** MIN, MAX or DEF; undefined for anything else. */
export function limitOf(text: string, limits: Limits): number | undefined {
  if (isWord(text, 'MINimum')) return limits.min;
  if (isWord(text, 'MAXimum')) return limits.max;
  if (isWord(text, 'DEFault')) return limits.def;
  return undefined;
}

function plainNumber(text: string, unitage: Unitage): number {
  const other = nonDecimal.exec(text);
  if (other) return Number.parseInt(other[1] ?? other[2] ?? other[3]!, other[1] ? 16 : other[2] ? 8 : 2);
  const match = decimal.exec(text);
  if (!match) throw new Refusal(/^[+-]?[.\d]/.test(text) ? -121 : -104);
  const [, digits, suffix] = match;
  if (suffix === undefined) return Number(digits);
  if (unitage === 'none') throw new Refusal(-138);
  const factor = factors[unitage][suffix.toUpperCase()];
  if (factor === undefined) throw new Refusal(-131);
  // By division where the factor is below one, so that 5 MS is 0.005 and not its neighbour.
  return factor >= 1 ? Number(digits) * factor : Number(digits) / Math.round(1 / factor);
}

export function integerOf(text: string, limits: Limits): number {
  return Math.round(numberOf(text, 'none', limits));
}

/** Throws −224 for a word that is neither ON nor OFF. */
export function booleanOf(text: string): boolean {
  if (/^on$/i.test(text)) return true;
  if (/^off$/i.test(text)) return false;
  if (/^[+-]?[.\d]/.test(text)) return Math.round(plainNumber(text, 'none')) !== 0;
  throw new Refusal(-224);
}

/** The short form of the word in the list that was written, long or short. Throws −224. */
export function wordOf(text: string, ...words: readonly string[]): string {
  const word = words.find((candidate) => isWord(text, candidate));
  if (word === undefined) throw new Refusal(-224);
  return shortForm(word);
}

/** `FREQuency`: true for FREQ and FREQUENCY in any case, for nothing between. */
export function isWord(text: string, word: string): boolean {
  const upper = text.toUpperCase();
  return upper === word.toUpperCase() || upper === shortForm(word);
}

export function shortForm(word: string): string {
  return word.replace(/[a-z]+/g, '');
}
