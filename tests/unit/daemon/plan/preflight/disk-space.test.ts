// By hand: 5 ties and 73 samples of 101 points are 83 traces of 1616 bytes, and 78 rows of 1500.
import { describe, expect, it } from 'vitest';
import { expandPlan } from '../../../../../daemon/plan/expand.ts';
import { archiveBytes, checkDiskSpace } from '../../../../../daemon/plan/preflight/disk-space.ts';
import { night, site } from './site.ts';

describe('disk space', () => {
  it('is reckoned from traces and rows', () => {
    const run = expandPlan(night({ tieEverySamples: 20 }), site());
    expect(run.steps.filter(({ purpose }) => purpose === 'tie')).toHaveLength(5);
    expect(archiveBytes(run, 101)).toBe(83 * 1616 + 78 * 1500);
  });

  it('is wanted twice, with room for what stands beside', () => {
    const free = (freeBytes: number) => checkDiskSpace(1e6, { kind: 'free', freeBytes, folder: '/site' });
    expect(free(18e6).verdict).toBe('go');
    expect(free(18e6 - 1)).toMatchObject({ verdict: 'no-go', facts: { neededBytes: 18e6 } });
  });

  it('needs a folder, and is not judged where it cannot be read', () => {
    expect(checkDiskSpace(1, { kind: 'no-folder', folder: '/gone' }).verdict).toBe('no-go');
    expect(checkDiskSpace(1, { kind: 'unknown', because: 'EIO' }).verdict).toBe('not-checked');
  });
});
