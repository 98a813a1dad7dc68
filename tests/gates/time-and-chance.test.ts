// Time and chance are passed in. The linter refuses the globals; this gate refuses what it cannot see:
// properties such as AbortSignal.timeout and Math.random, and suppressions of the rule itself.
import { readdirSync, readFileSync } from 'node:fs';
import { expect, it } from 'vitest';

const forbidden = [
  /AbortSignal\s*\.\s*timeout/,
  /Math\s*\.\s*random/,
  /globalThis\s*\.\s*(setTimeout|setInterval|performance|Date)/,
  /process\s*\.\s*hrtime/,
  /biome-ignore[^\n]*noRestricted/,
];
/** The one home of timers and dates. */
const exempt = new Set(['drivers/clock.ts']);

function offences(path: string, text: string): string[] {
  return forbidden.filter((pattern) => pattern.test(text)).map((pattern) => `${path}: ${pattern.source}`);
}

it('no source takes time or chance from the outside', () => {
  const files = ['daemon', 'drivers', 'mocks'].flatMap((folder) =>
    readdirSync(folder, { recursive: true, encoding: 'utf8' })
      .filter((name) => name.endsWith('.ts'))
      .map((name) => `${folder}/${name}`),
  );
  expect(files.length).toBeGreaterThan(20);
  const found = files
    .filter((path) => !exempt.has(path))
    .flatMap((path) => offences(path, readFileSync(path, 'utf8')));
  expect(found).toEqual([]);
});

it('would see an offence', () => {
  expect(offences('x.ts', 'const s = AbortSignal.timeout(5)')).toHaveLength(1);
});
