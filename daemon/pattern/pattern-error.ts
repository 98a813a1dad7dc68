// What is thrown when a caller hands the pattern mathematics something it cannot work on: angles out of
// order, a level that is no number. Not for "no answer exists": that is a value, see figure.ts.

/** Facts of one refusal: the offending value, where it stood, the limits. */
export type PatternFacts = Readonly<Record<string, string | number | boolean>>;

/**
 * Bad input to the pattern mathematics.
 *
 * `message` names the value and the remedy in one line; `facts` carries the values. The one code is
 * permanent; branch on it, never on the text.
 */
export class PatternError extends Error {
  override readonly name = 'PatternError';
  readonly code = 'PATTERN_BAD_INPUT' as const;
  readonly facts: PatternFacts;

  constructor(message: string, facts: PatternFacts = {}) {
    super(message);
    this.facts = facts;
  }
}

/**
 * Refuses a value that is not a finite number.
 *
 * @param name what the value is, with its unit (`frequencyHz`)
 * @param value the number to check
 * @returns the same number
 * @throws PatternError naming the value
 */
export function finite(name: string, value: number): number {
  if (Number.isFinite(value)) return value;
  throw new PatternError(`${name} is ${value}; hand in a finite number.`, { name, value: String(value) });
}

/**
 * Refuses a value that is not finite and above zero: lengths, distances, frequencies, impedances.
 *
 * @param name what the value is, with its unit
 * @param value the number to check
 * @returns the same number
 * @throws PatternError naming the value
 */
export function positive(name: string, value: number): number {
  if (finite(name, value) > 0) return value;
  throw new PatternError(`${name} is ${value}; hand in a number above zero.`, { name, value });
}
