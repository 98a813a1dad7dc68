import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { afterAll, describe, expect, it } from 'vitest';
import { DaemonError } from '../../../../daemon/errors.ts';
import { loadPlan, loadRangeFile } from '../../../../daemon/files/load.ts';
import { expandPlan } from '../../../../daemon/plan/expand.ts';
import { planLines, rangeLines, whole } from './written-files.ts';

const folder = mkdtempSync(join(tmpdir(), 'nightcut-files-'));
afterAll(() => rmSync(folder, { recursive: true }));

function written(name: string, content: string | Uint8Array): string {
  const path = join(folder, name);
  writeFileSync(path, content);
  return path;
}

async function refusal(loading: Promise<unknown>): Promise<DaemonError> {
  const error = await loading.then(
    () => undefined,
    (cause: unknown) => cause,
  );
  expect(error).toBeInstanceOf(DaemonError);
  return error as DaemonError;
}

describe('loading', () => {
  it('reads both kinds of file, without their byte order mark', async () => {
    const range = await loadRangeFile(written('range.yaml', `\uFEFF${whole(rangeLines)}`));
    expect(range.text).toBe(whole(rangeLines));
    expect(range.archive).toBe(join(folder, 'data/nightcut.sqlite'));
    expect((await loadPlan(written('a.plan.yaml', whole(planLines)))).path).toBe(join(folder, 'a.plan.yaml'));
  });

  it.each([
    ['is not there', 'missing.yaml', 'there is no such file'],
    ['is a folder', '.', 'it is no regular file'],
    ['lies below a file', 'range.yaml/x', 'there is no such file'],
    ['has no possible name', 'a\0b', 'ERR_INVALID_ARG_VALUE'],
  ])('tells when the file %s', async (_, name, reason) => {
    written('range.yaml', whole(rangeLines));
    const error = await refusal(loadRangeFile(`${folder}/${name}`));
    expect(error.code).toBe('FILE_UNREADABLE');
    expect(error.message).toContain(`: cannot be read: ${reason}; name the range file with --range PATH`);
    expect(error.message).toContain(folder);
    expect(error.message).not.toMatch(/[\n\0]/);
  });

  it('refuses devices, which never end', async () => {
    expect((await refusal(loadPlan('/dev/zero'))).message).toBe(
      '/dev/zero: cannot be read: it is no regular file; name an existing plan',
    );
  });

  it('refuses what is no text and what is too long', async () => {
    const latin1 = await refusal(loadPlan(written('l.yaml', Uint8Array.of(0x61, 0x3a, 0x20, 0xe4))));
    expect(latin1.code).toBe('FILE_INVALID');
    expect(latin1.message).toMatch(/l\.yaml:1: expected UTF-8 text; found other bytes$/);
    const long = await refusal(loadPlan(written('long.yaml', '#\n'.repeat(500_001))));
    expect(long.message).toMatch(/long\.yaml:1: expected at most 1 MB of text; found more$/);
  });
});

describe('the demo', () => {
  const demo = (name: string) => fileURLToPath(new URL(`../../../../mocks/demo/${name}`, import.meta.url));

  it('has a range file and plans that fit each other', async () => {
    const range = await loadRangeFile(demo('range.yaml'));
    const reference = expandPlan(await loadPlan(demo('reference.plan.yaml')), range);
    expect(reference.steps).toHaveLength(5);
    const yagi = expandPlan(await loadPlan(demo('yagi5.plan.yaml')), range);
    // Two full turns of 361 samples, each with ties at start, after every 60 and at the end.
    expect(yagi.steps.filter((step) => step.purpose !== 'tie')).toHaveLength(722);
    expect(yagi.steps.filter((step) => step.purpose === 'tie')).toHaveLength(2 * (1 + 6 + 1));
  });
});
