// DEVELOPERS.md carries the table of error codes; it and the code must say the same, both ways. And every
// code is raised by some test: one that nothing raises is not known to work.
import { readdirSync, readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { adviceTable } from '../../daemon/errors.ts';

const codes = Object.keys(adviceTable);

function documented(): Map<string, string> {
  const rows = readFileSync('DEVELOPERS.md', 'utf8').matchAll(/^\| `([A-Z]+_[A-Z_]+|DEFECT)` \| (.*?) \|/gm);
  return new Map(Array.from(rows, (row) => [row[1] ?? '', row[2] ?? '']));
}

function testTexts(): string {
  return readdirSync('tests', { recursive: true, encoding: 'utf8' })
    .filter((name) => name.endsWith('.test.ts') && !name.includes('error-table'))
    .map((name) => readFileSync(`tests/${name}`, 'utf8'))
    .join('\n');
}

describe('the table of error codes', () => {
  it('stands in DEVELOPERS.md with the same meaning', () => {
    const meanings = Object.fromEntries(
      Object.entries(adviceTable).map(([code, advice]) => [code, advice.meaning]),
    );
    expect(Object.fromEntries(documented())).toEqual(meanings);
  });

  it('has a test that names each code', () => {
    const texts = testTexts();
    expect(codes.filter((code) => !texts.includes(code))).toEqual([]);
  });

  it('gives a next step that is a sentence', () => {
    for (const [code, { nextStep, meaning }] of Object.entries(adviceTable)) {
      expect(nextStep, code).toMatch(/^[A-Z`].*\.$/);
      expect(meaning, code).toMatch(/^[A-Z].*\.$/);
    }
  });
});
