// The shape of `analyzer.dialect` in a range file: the name of a built-in dialect, or a mapping with the dialect it
// is based on and what differs. What the parts demand of each other is in read-dialect.ts.
import { z } from 'zod';
import { scanTemplateNames } from '../../drivers/analyzer/scan-table/scan-table-dialect.ts';
import { dialectNames } from '../../drivers/analyzer/scpi-dialects.ts';
import { templateNames } from '../../drivers/analyzer/scpi-templates.ts';
import { choice, keys, list, name, quantity, refuse, wholeNumber } from './fields.ts';

/** What may stand there as a name alone; a scan-table needs more than its name. */
export const builtInNames = dialectNames;
const baseNames = [...dialectNames, 'scan-table'];
const longestMessage = 500;
const mostMessages = 8;

const templateKeys = [...new Set<string>([...templateNames, ...scanTemplateNames])];

const completion = keys({
  by: choice(['operation-complete-bit', 'poll', 'wait']),
  query: message().optional(),
  until: name('the word or number that the query answers at the end').optional(),
  factor: factor().optional(),
});

const mapping = keys({
  base: choice(baseNames),
  templates: keys(Object.fromEntries(templateKeys.map((key) => [key, template().optional()]))).prefault({}),
  channel: wholeNumber(1, 200).optional(),
  oneStartRuns: choice(['one-sweep', 'whole-average']).optional(),
  completion: completion.optional(),
  columns: list(choice(['frequency', 're', 'im']), 'a list such as [frequency, re, im]', 2).optional(),
  identity: name('what the instrument is called').optional(),
  prompt: name('what the instrument prints when it is ready, without blanks around it', 40).optional(),
  sendsLineEnd: choice(['lf', 'cr', 'crlf']).optional(),
  source: choice(['switched', 'only-while-scanning']).optional(),
  correctionOnSays: name('words of the answer to correctionQuery').optional(),
  fixed: keys({
    ifBandwidth: quantity('frequency', { above: 0, says: 'above 0 Hz' }).optional(),
    power: quantity('power').optional(),
  }).optional(),
});

const expectation = `one of ${baseNames.join(', ')}, or a mapping with base and templates`;

export const dialectSchema = z
  .preprocess((written, context) => {
    if (typeof written === 'object' && written !== null && !Array.isArray(written)) return written;
    if (typeof written === 'string' && baseNames.includes(written)) return { base: written };
    refuse(context, expectation);
    return z.NEVER;
  }, mapping)
  .meta({ description: expectation });

export type DialectText = z.output<typeof mapping>;

/** One command or query, a list of commands, or none. */
function template() {
  const says = `one line of printable ASCII without ;, a list of up to ${mostMessages}, or none`;
  return z
    .unknown()
    .transform((written, context): readonly string[] | 'none' => {
      if (written === 'none') return 'none';
      const lines: unknown[] = Array.isArray(written) ? written : [written];
      if (lines.length >= 1 && lines.length <= mostMessages && lines.every(isMessage)) return lines;
      const hasControl = lines.some((line) => typeof line === 'string' && /[^\x20-\x7e]/.test(line));
      const hasSecond = lines.some((line) => typeof line === 'string' && line.includes(';'));
      refuse(
        context,
        says,
        hasControl
          ? 'no control characters, no letters beyond ASCII'
          : hasSecond
            ? 'one command each; write several as a list'
            : undefined,
      );
      return z.NEVER;
    })
    .meta({
      anyOf: [{ type: 'string' }, { type: 'array', items: { type: 'string' }, minItems: 1 }],
      description: says,
    });
}

function message() {
  const says = 'one question of printable ASCII without ;';
  return z
    .string({ error: says })
    .refine((text) => isMessage(text), { error: says })
    .meta({ description: says });
}

function isMessage(line: unknown): line is string {
  return (
    typeof line === 'string' &&
    /^[\x20-\x7e]+$/.test(line) &&
    !line.includes(';') &&
    line.length <= longestMessage
  );
}

/** How much longer than stated is waited. */
function factor() {
  const says = 'a number from 1 to 20';
  return z
    .string({ error: says })
    .transform((text, context): number => {
      if (/^\d{1,2}(\.\d{1,6})?$/.test(text) && Number(text) >= 1 && Number(text) <= 20) return Number(text);
      refuse(context, says);
      return z.NEVER;
    })
    .meta({ type: 'number', minimum: 1, maximum: 20 });
}
