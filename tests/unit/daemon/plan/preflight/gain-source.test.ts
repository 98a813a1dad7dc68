import { describe, expect, it } from 'vitest';
import { checkGainSource, type ReferenceState } from '../../../../../daemon/plan/preflight/gain-source.ts';
import { night, site } from './site.ts';

const hour = 3_600_000;
const now = 100 * hour;
const found = (changes: object = {}): ReferenceState => ({
  kind: 'found',
  run: 4,
  antenna: 'dipole',
  endedWallMs: now - 2 * hour,
  rangeLengthM: 8,
  ...changes,
});
const judge = (state: ReferenceState) => checkGainSource(night(), site(), state, now);

describe('the gain reference of a pattern run', () => {
  it('goes when it is fresh and fits', () => {
    expect(judge(found())).toMatchObject({ verdict: 'go', facts: { run: 4, ageMs: 2 * hour } });
    expect(judge(found()).text).toContain('run 4 on dipole, 2 h old');
    expect(judge(found({ endedWallMs: now - 24 * hour })).verdict).toBe('go');
  });

  it('is warned of when it is of another day', () => {
    const old = judge(found({ endedWallMs: now - 72 * hour }));
    expect(old.verdict).toBe('caution');
    expect(old.text).toContain('3 days old');
  });

  it('does not do when it was taken at another range length', () => {
    const other = judge(found({ rangeLengthM: 6 }));
    expect(other.verdict).toBe('no-go');
    expect(other.text).toContain('taken at 6 m, the range file now says 8 m');
  });

  it('is missed where it is asked for', () => {
    expect(judge({ kind: 'no-archive', path: '/site/a.sqlite' })).toMatchObject({ verdict: 'no-go' });
    expect(judge({ kind: 'refused', because: 'other grid', nextStep: 'do this' })).toMatchObject({
      verdict: 'no-go',
      text: 'other grid',
      change: 'do this',
    });
    expect(judge({ kind: 'not-asked' }).verdict).toBe('go');
  });
});

describe('the gain table of a reference run', () => {
  const at = (frequencyHz: number) => ({ frequencyHz, gainDbi: 2 });
  const table = (fromHz: number, toHz: number, name = 'dipole') => ({
    name,
    stated: 'ieee' as const,
    table: [at(fromHz), at(toHz)],
  });
  const plan = night({
    kind: 'reference',
    antenna: { name: 'dipole', revision: 'A' },
    band: { startHz: 820e6, stopHz: 920e6, points: 11 },
  });
  const verdictOf = (reference?: ReturnType<typeof table>) =>
    checkGainSource(plan, site(reference ? { reference } : {}), { kind: 'not-asked' }, now);

  it('covers the band, ends included', () => {
    expect(verdictOf(table(820e6, 920e6)).verdict).toBe('go');
    expect(verdictOf(table(821e6, 920e6)).verdict).toBe('no-go');
    expect(verdictOf(table(820e6, 919e6))).toMatchObject({
      verdict: 'no-go',
      text: 'the gain table of dipole covers 820 MHz to 919 MHz, the plan 820 MHz to 920 MHz',
      change: 'widen the table or narrow the band',
    });
  });

  it('is there, and of the antenna that is measured', () => {
    expect(verdictOf().verdict).toBe('no-go');
    expect(verdictOf(table(820e6, 920e6, 'horn')).text).toContain('the gain table is that of horn');
  });
});
