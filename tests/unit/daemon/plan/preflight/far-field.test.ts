// By hand: 0.4 m and 0.6 m are 1 m together, and 2·1²/0.5 m = 4 m at the top; 10 D = 6 m; 5 λ = 5 m at the
// bottom. So 6 m are needed.
import { describe, expect, it } from 'vitest';
import { checkFarField } from '../../../../../daemon/plan/preflight/far-field.ts';
import { halfMetreHz, night, oneMetreHz, site, siteWithout } from './site.ts';

describe('the far field', () => {
  it('is told by the largest of three demands', () => {
    const { facts, verdict, text } = checkFarField(night(), site());
    expect(verdict).toBe('go');
    expect(facts['curvatureM']).toBeCloseTo(4, 9);
    expect(facts['sizesM']).toBeCloseTo(6, 9);
    expect(facts['wavelengthsM']).toBeCloseTo(5, 9);
    expect(facts['neededM']).toBeCloseTo(6, 9);
    expect(text).toContain('is 4 m, 10 D is 6 m, 5 λ at 299.792 MHz is 5 m');
  });

  it.each([
    ['10 D', 5.9, { sizeM: 0.6 }, 'make the range at least 6.00 m long'],
    ['5 λ', 4.9, { sizeM: 0.3 }, 'make the range at least 5.00 m long'],
    // 1.6 m together: 2·2.56/0.5 = 10.24 m; the larger antenna's 10 D are 12 m.
    ['both', 8, { sizeM: 1.2 }, 'make the range at least 12.00 m long'],
  ])('is missed by %s at %d m', (_, rangeLengthM, expected, change) => {
    const finding = checkFarField(night({ expected }), site({ rangeLengthM }));
    expect(finding).toMatchObject({ verdict: 'no-go', change });
  });

  it('offers a lower top of the band where the curvature alone is too much', () => {
    // 0.7 m and 0.7 m: 2·1.96/0.5 = 7.84 m against 7 m and 5 m. 7.5 m do up to 7.5·c/3.92 = 573.58 MHz.
    const plan = night({ expected: { sizeM: 0.7 } });
    const range = site({ rangeAntennaSizeM: 0.7, rangeLengthM: 7.5 });
    expect(checkFarField(plan, range)).toMatchObject({
      verdict: 'no-go',
      change: 'make the range at least 7.84 m long, or end the band at 573 MHz',
    });
    const band = { startHz: oneMetreHz, stopHz: 573e6, points: 11 };
    expect(checkFarField({ ...plan, band }, range).verdict).toBe('go');
    expect(checkFarField({ ...plan, band: { ...band, stopHz: halfMetreHz } }, range).verdict).toBe('no-go');
  });

  it('judges nothing without both sizes', () => {
    const without = siteWithout('rangeAntennaSizeM');
    expect(checkFarField(night({ expected: {} }), without)).toEqual({
      subject: 'far-field',
      verdict: 'not-checked',
      text: 'give antennas.rangeAntennaSize in the range file, antenna.size in the plan',
      facts: {},
    });
    expect(checkFarField(night(), without).text).not.toContain('in the plan');
    expect(checkFarField(night({ expected: {} }), site()).text).toBe('give antenna.size in the plan');
  });

  it('takes the size of the reference antenna in its own run', () => {
    const reference = { name: 'yagi', stated: 'ieee', table: [], sizeM: 0.9 } as const;
    const finding = checkFarField(night({ kind: 'reference', expected: {} }), site({ reference }));
    expect(finding.facts['sizesM']).toBeCloseTo(9, 9);
    expect(finding.verdict).toBe('no-go');
  });
});
