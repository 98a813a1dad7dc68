// The JSON Schemas in the repository are those the loaders hold. After a change of the loaders,
// `NIGHTCUT_WRITE_SCHEMAS=1 npx vitest run tests/gates/file-schemas.test.ts` writes them anew.
import { readFileSync, writeFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { schemaFiles } from '../../daemon/files/json-schema.ts';

describe('JSON Schemas of the written files', () => {
  it.each(Object.entries(schemaFiles()))('%s is up to date', (name, text) => {
    const path = new URL(`../../daemon/files/schema/${name}`, import.meta.url);
    if (process.env['NIGHTCUT_WRITE_SCHEMAS'] === '1') writeFileSync(path, text);
    expect(readFileSync(path, 'utf8')).toBe(text);
  });
});
