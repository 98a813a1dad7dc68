// Links in the documents lead somewhere, and the documents name no machine.
import { existsSync, readFileSync } from 'node:fs';
import { expect, it } from 'vitest';

const documents = ['README.md', 'DEVELOPERS.md', 'SAFETY.md', 'CHANGELOG.md'];

it.each(documents)('every link of %s leads to a file', (name) => {
  const text = readFileSync(name, 'utf8');
  const links = Array.from(text.matchAll(/\]\(([^)#:]+)\)/g), (match) => match[1] ?? '');
  expect(links.filter((path) => !existsSync(path))).toEqual([]);
});

it.each(documents)('every `path/file.ts` that %s names exists', (name) => {
  const text = readFileSync(name, 'utf8');
  const paths = Array.from(
    text.matchAll(/`((?:daemon|drivers|mocks|tests|dashboard)\/[\w./-]+)`/g),
    (m) => m[1]!,
  );
  expect(paths.filter((path) => !existsSync(path))).toEqual([]);
});
