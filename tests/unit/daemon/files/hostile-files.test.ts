// Whatever stands in a file, the answer is values or one DaemonError with a one-line message, soon.
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { parsePlan } from '../../../../daemon/files/parse-plan.ts';
import { parseRangeFile } from '../../../../daemon/files/parse-range-file.ts';
import { refusalOf } from './refusal.ts';
import { planLines, rangeLines, whole } from './written-files.ts';

const bomb = ['a: &a [x, x, x, x, x, x, x, x, x, x]']
  .concat(['b', 'c', 'd', 'e', 'f'].map((key, i) => `${key}: &${key} [${`*${'abcde'[i]}, `.repeat(9)}x]`))
  .join('\n');

const hostile: [string, string, string][] = [
  ['nothing at all', '', ':1: expected keys with values; found nothing'],
  ['a comment alone', '# range\n', ':1: expected keys with values; found nothing'],
  ['a list', '\n- a\n', ':2: expected keys with values; found a list'],
  ['a word', 'range', ':1: expected keys with values; found "range"'],
  ['a NUL', '\0', ':1: expected keys with values; found "\\u0000"'],
  ['brackets without end', '[\n'.repeat(100_000), ':21: expected at most 20 levels; found more'],
  ['braces without end', '{a: '.repeat(240), ':1: expected at most 20 levels; found more'],
  ['lists in lists', `a:\n  ${'- '.repeat(400)}x\n`, ':2: a[0][0]: expected at most 20 levels; found more'],
  [
    'a line without end',
    `a: ${'x'.repeat(5000)}`,
    ':1: expected lines of at most 1000 characters; found a longer one',
  ],
  ['an alias bomb', bomb, ':1: expected at most 100 values through anchors; found more'],
  ['an anchor in itself', 'range: &a [*a]\n', ':1: range: expected the name of the range'],
  [
    'more than a megabyte',
    `range: x\n${'#\n'.repeat(500_000)}`,
    ':1: expected at most 1 MB of text; found more',
  ],
  ['a merge key', '<<: { range: x }\n', ':1: unknown key `<<`; known here: range,'],
  ['a directive', '%YAML 1.1\n---\nrange: yes\n', ':3: rangeLength: expected a length'],
];

describe('hostile text', () => {
  it.each(hostile)('%s', (_, text, expected) => {
    const error = refusalOf(() => parseRangeFile(text, 'range.yaml'));
    expect(error.code).toBe('FILE_INVALID');
    expect(error.message).not.toContain('\n');
    const [, at = '', rest = ''] = /^(:\d+: )(.*)$/.exec(expected) ?? [];
    const problems = String(error.facts['problems']);
    expect(problems.includes(`range.yaml${at}${rest}`), error.message).toBe(true);
  });

  it('with very many keys is answered within seconds', () => {
    const text = Array.from({ length: 100_000 }, (_, i) => `k${i}:\n`).join('');
    const error = refusalOf(() => parseRangeFile(text, 'range.yaml'));
    expect(error.message.length).toBeLessThan(300);
    expect(String(error.facts['problems']).split('\n')).toHaveLength(20);
  });
});

const piece = fc.oneof(
  fc.constantFrom(
    ...[
      '\t',
      '\n',
      '\r',
      ': ',
      '- ',
      '{',
      '}',
      '[',
      ']',
      '"',
      "'",
      '|',
      '>',
      '&a ',
      '*a',
      '!x',
      '#',
      '\u2028',
      '\0',
    ],
    ...[
      '__proto__',
      'constructor',
      'null',
      '~',
      '.nan',
      '1e999',
      '868 MHz',
      '-',
      ',',
      '?',
      '%',
      '@',
      '`',
      '\uFEFF',
    ],
    ...['\u202e', '\ud800', '\u0085', 'name', 'at', 'cuts', 'axes'],
  ),
  fc.string({ maxLength: 5 }),
);

/** A valid text with a few stretches replaced. */
function mutated(text: string) {
  const change = fc.record({ at: fc.nat(text.length), length: fc.nat(12), by: piece });
  return fc
    .array(change, { minLength: 1, maxLength: 5 })
    .map((changes) =>
      changes.reduce((now, { at, length, by }) => now.slice(0, at) + by + now.slice(at + length), text),
    );
}

describe.each([
  ['range file', rangeLines, parseRangeFile],
  ['plan', planLines, parsePlan],
] as const)('a mutated %s', (_, lines, parse) => {
  it('is read or refused in one line', () => {
    let refused = 0;
    fc.assert(
      fc.property(mutated(whole(lines)), (text) => {
        try {
          parse(text, 'f.yaml');
        } catch {
          refused += 1;
          const error = refusalOf(() => parse(text, 'f.yaml'));
          expect(error.code).toBe('FILE_INVALID');
          expect(error.message).toMatch(/^f\.yaml:[1-9]\d*: [^\p{Cc}\u2028\u2029]+$/u);
          expect(error.message.length).toBeLessThan(700);
        }
      }),
      { numRuns: 600 },
    );
    expect(refused).toBeGreaterThan(200);
  });
});
