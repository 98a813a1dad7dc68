import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { dialectNamed, dialectNames } from '../../../../drivers/analyzer/scpi-dialects.ts';
import { fillTemplate, problemsOf, type ScpiDialect } from '../../../../drivers/analyzer/scpi-templates.ts';

const bad = expect.objectContaining({ code: 'ANALYZER_BAD_DIALECT' });

describe('templates', () => {
  it('are filled in', () => {
    expect(
      fillTemplate(':CALC{channel}:PAR{trace}:DEF {parameter}', { channel: 1, trace: 2, parameter: 'S21' }),
    ).toEqual([':CALC1:PAR2:DEF S21']);
    expect(fillTemplate([':A {value}', ':B'], { value: 868300000 })).toEqual([':A 868300000', ':B']);
    expect(fillTemplate(':A {value}', { value: -0.5 })).toEqual([':A -0.5']);
  });

  it.each(['S21;:OUTP ON', 'S21\n:OUTP ON', 'S21\r', '"S21"', "S21'", '\x00', '', 'S21\x7f', 'ſ21'])(
    'refuse %j as a value',
    (parameter) => {
      expect(() => fillTemplate(':DEF {parameter}', { parameter })).toThrow(bad);
    },
  );

  it('refuse what is missing, no number, or a second message', () => {
    expect(() => fillTemplate(':A {value}', {})).toThrow(bad);
    expect(() => fillTemplate(':A {constructor}', {})).toThrow(bad);
    expect(() => fillTemplate(':A {value}', { value: Number.NaN })).toThrow(bad);
    expect(() => fillTemplate(':A 1;:B 2', {})).toThrow(bad);
    expect(() => fillTemplate(':A\n', {})).toThrow(bad);
  });

  it('never let a value end the message', () => {
    fc.assert(
      fc.property(fc.string({ unit: 'binary' }), (parameter) => {
        let messages: string[];
        try {
          messages = fillTemplate(':DEF {parameter}', { parameter });
        } catch {
          return;
        }
        expect(messages).toEqual([expect.stringMatching(/^:DEF [\x20-\x7e]+$/)]);
        expect(messages[0]).not.toMatch(/[;"'`]/);
      }),
      { numRuns: 500 },
    );
  });
});

describe('dialects', () => {
  it('that are built in can be used, and others are refused by name', () => {
    expect(dialectNames).toContain('numbered-parameter');
    for (const name of dialectNames) expect(problemsOf(dialectNamed(name))).toEqual([]);
    expect(() => dialectNamed('no-such-thing')).toThrow(bad);
  });

  it('say what is wrong with them', () => {
    const good = dialectNamed('numbered-parameter');
    const { abort: _, ...rest } = good.templates;
    const wrong = {
      ...good,
      templates: { ...rest, power: ':POW?', powerQuery: ':POW', points: ':SWE:POIN {pints}', speed: ':X' },
    } as unknown as ScpiDialect;
    const problems = problemsOf(wrong).join('\n');
    for (const words of [
      "'abort' is missing",
      "'speed' is no template",
      "'power' must ask nothing",
      "'powerQuery' must be one query",
      '{pints}',
    ]) {
      expect(problems).toContain(words);
    }
  });
});
