// By hand: c/1 m of span in 24 steps tells 24 m apart, three times 8 m; in 23 steps only 23 m.
import { describe, expect, it } from 'vitest';
import { checkFrequencyGrid } from '../../../../../daemon/plan/preflight/frequency-grid.ts';
import { halfMetreHz, night, oneMetreHz, site } from './site.ts';

const withPoints = (points: number) => night({ band: { startHz: oneMetreHz, stopHz: halfMetreHz, points } });

describe('the frequency grid', () => {
  it('tells ways apart up to three range lengths', () => {
    const { verdict, facts } = checkFrequencyGrid(withPoints(25), site({ rangeLengthM: 7.999 }));
    expect(verdict).toBe('go');
    expect(facts['aliasFreeM']).toBeCloseTo(24, 9);
  });

  it('says how many points it would take', () => {
    const finding = checkFrequencyGrid(withPoints(24), site());
    expect(finding.verdict).toBe('caution');
    expect(finding.change).toContain('at least 25 points');
  });
});
