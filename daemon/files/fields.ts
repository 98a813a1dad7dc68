// The kinds of value that range files and plans are made of, as zod schemas over written text. A schema's
// message is only what was expected; the place, what was found and the wording are file-problems.ts's business.
// Advice on a known slip travels in the issue's params.
import { z } from 'zod';
import {
  type ParsedQuantity,
  parseQuantity,
  type QuantityKind,
  quantities,
  quantityPattern,
} from './quantity.ts';

export interface Limits {
  above?: number;
  from?: number;
  to?: number;
  /** The limits in words, after the quantity: `above 0 Hz`. */
  says: string;
}

/** `868 MHz` to its value in the base unit (see quantity.ts). */
export function quantity(kind: QuantityKind, limits?: Limits) {
  const { expectation } = quantities[kind];
  return read(expectation, limits, (text) => parseQuantity(text, kind)).meta({
    type: 'string',
    pattern: quantityPattern(kind),
    description: limits ? `${expectation}, ${limits.says}` : expectation,
  });
}

/** Controller units per degree: the key already says so, hence the unit may be left out. */
export function unitsPerDegree() {
  const parse = (text: string): ParsedQuantity =>
    parseQuantity(/^[+-]?[\d.]+$/.test(text) ? `${text} units/deg` : text, 'scale');
  const { expectation } = quantities.scale;
  const meta = { type: ['number', 'string'], description: expectation } as const;
  return read(expectation, undefined, parse).meta(meta);
}

/** A whole number without unit. */
export function wholeNumber(from: number, to: number) {
  const expectation = `a whole number from ${from} to ${to}`;
  return read(expectation, { from, to, says: '' }, (text) => {
    if (!/^[+-]?\d{1,15}$/.test(text)) return { kind: 'refused' };
    return { kind: 'value', value: Number(text) + 0 };
  }).meta({ type: 'integer', minimum: from, maximum: to });
}

/** One of a few words; advice for words that one could expect here. */
export function choice<const Word extends string>(
  words: readonly Word[],
  advice: Readonly<Record<string, string>> = {},
) {
  const expectation = words.length > 1 ? `one of ${words.join(', ')}` : `${words[0]}`;
  return z
    .string({ error: expectation })
    .transform((text, context): Word => {
      const word = words.find((one) => one === text);
      if (word !== undefined) return word;
      refuse(context, expectation, Object.hasOwn(advice, text) ? advice[text] : undefined);
      return z.NEVER;
    })
    .meta({ enum: [...words] });
}

/** A name for people: one line of visible text. */
export function name(what: string, longest = 80) {
  const expectation = `${what} of 1 to ${longest} characters`;
  return z
    .string({ error: expectation })
    .transform((text, context): string => {
      const control = /[\p{Cc}\p{Cf}\p{Zl}\p{Zp}\p{Cs}]/u.test(text);
      if (!control && text !== '' && text === text.trim() && [...text].length <= longest) return text;
      refuse(context, expectation, control ? 'no control characters' : undefined);
      return z.NEVER;
    })
    .meta({ type: ['string', 'number'], description: expectation });
}

/** The name of an axis, as keys: also a word that every JavaScript object knows would be a trap later. */
export function axisName() {
  const expectation = 'an axis name such as azimuth: letters, digits and -, beginning with a small letter';
  return z
    .string({ error: expectation })
    .refine((text) => /^[a-z][A-Za-z0-9-]{0,29}$/.test(text) && !(text in {}), { error: expectation });
}

/** A mapping with these keys and no others. */
export function keys<Shape extends z.core.$ZodLooseShape>(shape: Shape) {
  const known = Object.keys(shape).join(', ');
  return z.strictObject(shape, {
    error: (issue) => (issue.code === 'invalid_type' ? `a mapping with ${known}` : undefined),
  });
}

export function list<Item extends z.ZodType>(item: Item, what: string, least = 0) {
  return z.array(item, { error: what }).min(least, { error: what });
}

function read(expectation: string, limits: Limits | undefined, parse: (text: string) => ParsedQuantity) {
  return z.string({ error: expectation }).transform((text, context): number => {
    const parsed = parse(text);
    if (parsed.kind === 'refused') {
      refuse(context, expectation, parsed.advice);
      return z.NEVER;
    }
    if (within(parsed.value, limits)) return parsed.value;
    refuse(context, limits?.says ? `${expectation}, ${limits.says}` : expectation);
    return z.NEVER;
  });
}

function within(value: number, limits: Limits = { says: '' }): boolean {
  const { above = Number.NEGATIVE_INFINITY, from = above, to = Number.POSITIVE_INFINITY } = limits;
  return value > above && value >= from && value <= to;
}

/** Adds an issue; `advice` is shown after what was found. */
export function refuse(context: z.core.$RefinementCtx, expectation: string, advice?: string): void {
  context.addIssue({ code: 'custom', message: expectation, params: advice === undefined ? {} : { advice } });
}
