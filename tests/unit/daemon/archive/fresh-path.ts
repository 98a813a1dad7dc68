// Where a test puts its archive.
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { onTestFinished } from 'vitest';

/** Path of an archive in a folder of its own, removed when the test ends. */
export function freshPath(name = 'runs.archive'): string {
  const folder = mkdtempSync(join(tmpdir(), 'nightcut-archive-'));
  onTestFinished(() => rmSync(folder, { recursive: true, force: true }));
  return join(folder, name);
}
