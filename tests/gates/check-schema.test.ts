// The JSON Schema of `check/1` in the repository is the one the program holds. After a change of the
// document, `NIGHTCUT_WRITE_SCHEMAS=1 npx vitest run tests/gates/check-schema.test.ts` writes it anew.
import { readFileSync, writeFileSync } from 'node:fs';
import { expect, it } from 'vitest';
import { checkSchemaText } from '../../daemon/plan/preflight/check-document.ts';

it('check.schema.json is up to date', () => {
  const path = new URL('../../daemon/plan/preflight/schema/check.schema.json', import.meta.url);
  if (process.env['NIGHTCUT_WRITE_SCHEMAS'] === '1') writeFileSync(path, checkSchemaText());
  expect(readFileSync(path, 'utf8')).toBe(checkSchemaText());
});
