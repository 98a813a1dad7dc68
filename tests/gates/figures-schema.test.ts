// The JSON Schema of `figures/1` in the repository is the one the program holds. After a change of the
// document, `NIGHTCUT_WRITE_SCHEMAS=1 npx vitest run tests/gates/figures-schema.test.ts` writes it anew.
import { readFileSync, writeFileSync } from 'node:fs';
import { expect, it } from 'vitest';
import { figuresSchemaText } from '../../daemon/results/figures-document.ts';

it('figures.schema.json is up to date', () => {
  const path = new URL('../../daemon/results/schema/figures.schema.json', import.meta.url);
  if (process.env['NIGHTCUT_WRITE_SCHEMAS'] === '1') writeFileSync(path, figuresSchemaText());
  expect(readFileSync(path, 'utf8')).toBe(figuresSchemaText());
});
