// Each numbered rule of SAFETY.md names the test that proves what the software does about it; the test
// must exist by that name. A rule that no software can prove says so.
import { readdirSync, readFileSync } from 'node:fs';
import { expect, it } from 'vitest';

const text = readFileSync('SAFETY.md', 'utf8');
const rules = text.split(/^## (?=Rule \d+)/m).slice(1);

it('numbers its rules without gaps', () => {
  const numbers = rules.map((rule) => Number(/^Rule (\d+)/.exec(rule)?.[1]));
  expect(numbers.length).toBeGreaterThanOrEqual(9);
  expect(numbers).toEqual(numbers.map((_, index) => index + 1));
});

it('says for each rule what proves it, and that test exists', () => {
  const tests = readdirSync('tests', { recursive: true, encoding: 'utf8' })
    .filter((name) => name.endsWith('.test.ts'))
    .map((name) => readFileSync(`tests/${name}`, 'utf8'));
  for (const rule of rules) {
    const title = rule.split('\n')[0];
    const proof = /^\*\*Proof:\*\* (.*(?:\n(?!\n).*)*)/m.exec(rule)?.[1]?.replace(/\s+/g, ' ');
    expect(proof, title).toBeDefined();
    if (proof?.startsWith('none')) continue;
    const named = Array.from(proof?.matchAll(/“([^”]+)”/g) ?? [], (match) => match[1] ?? '');
    expect(named.length, `${title}: names a test`).toBeGreaterThan(0);
    for (const name of named) {
      expect(
        tests.some((source) => source.includes(name)),
        `${title}: test “${name}”`,
      ).toBe(true);
    }
  }
});
