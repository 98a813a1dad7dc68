import { describe, expect, it } from 'vitest';
import { checkDocument } from '../../../../../daemon/plan/preflight/check-document.ts';
import { checkNight } from '../../../../../daemon/plan/preflight/check-night.ts';
import { subjects } from '../../../../../daemon/plan/preflight/finding.ts';
import { cut } from '../planned.ts';
import { night, site, siteWithout } from './site.ts';

const now = {
  nowWallMs: 1_800_000_000_000,
  reference: { kind: 'not-asked' },
  disk: { kind: 'free', freeBytes: 1e12, folder: '/site' },
} as const;

describe('the check of a night', () => {
  it('is a document with every subject once, go when none says no', () => {
    const document = checkDocument.parse(checkNight(night(), site(), now));
    expect(document.checks.map((check) => check.subject)).toEqual([...subjects]);
    expect(document.verdict).toBe('go');
    expect(document.checks.filter((check) => check.verdict === 'caution')).not.toEqual([]);
    expect(document.predicted).toMatchObject({ samples: 76 });
    expect(document.predicted!.endWallMs - now.nowWallMs).toBeCloseTo(document.predicted!.durationMs, 2);
  });

  it('is no-go for one reason alone', () => {
    const disk = { kind: 'no-folder', folder: '/gone' } as const;
    const document = checkNight(night(), site(), { ...now, disk });
    expect(document.verdict).toBe('no-go');
    expect(document.checks.filter((check) => check.verdict === 'no-go')).toHaveLength(1);
  });

  it('takes what it cannot check for neither', () => {
    const bare = siteWithout('rangeAntennaSizeM', 'cableLossDb', 'autOffsetM', 'heights', 'nearestWallM');
    const document = checkNight(night({ expected: {} }), bare, now);
    expect(document.verdict).toBe('go');
    const unchecked = document.checks.filter((check) => check.verdict === 'not-checked');
    expect(unchecked.map((check) => check.subject)).toEqual([
      'far-field',
      'link-budget',
      'angular-step',
      'ground-bounce',
      'wall-echo',
      'radiated-power',
    ]);
    for (const { text } of unchecked) expect(text).toMatch(/^give \w/);
  });

  it('predicts nothing for a plan the axes cannot follow', () => {
    const document = checkDocument.parse(checkNight(night({ cuts: [cut({ axis: 'roll' })] }), site(), now));
    expect(document.verdict).toBe('no-go');
    expect('predicted' in document).toBe(false);
    expect(document.checks.map((check) => check.subject)).not.toContain('duration');
  });
});
