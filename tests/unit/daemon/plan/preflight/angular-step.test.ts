// By hand: r = 0.3 m and λ = 0.5 m give 0.5/1.2 rad = 23.873°; with 0.7 m offset r = 1 m, 0.125 rad = 7.162°.
import { describe, expect, it } from 'vitest';
import { checkAngularStep, largestStepDeg } from '../../../../../daemon/plan/preflight/angular-step.ts';
import { cut } from '../planned.ts';
import { halfMetreHz, night, site, siteWithout } from './site.ts';

describe('the angular step', () => {
  it('is judged by the radius about the axis', () => {
    expect(checkAngularStep(night(), site()).facts['limitDeg']).toBeCloseTo(23.873, 3);
    const off = checkAngularStep(night(), site({ autOffsetM: 0.7 }));
    expect(off.facts['limitDeg']).toBeCloseTo(7.162, 3);
    expect(off.verdict).toBe('go');
  });

  it('is refused where one cut is too coarse, with the step that would do', () => {
    const cuts = [
      cut({ stepDeg: 5 }),
      cut({ name: 'tilt', stepDeg: 7.5 }),
      cut({ name: 'last', stepDeg: 1 }),
    ];
    const finding = checkAngularStep(night({ cuts }), site({ autOffsetM: 0.7 }));
    expect(finding.verdict).toBe('no-go');
    expect(finding.text).toContain('7.5° (cut tilt)');
    expect(finding.change).toBe('step by at most 7.16°, or mount the AUT nearer to the axis');
  });

  it('samples the level of two edges on opposite sides: its fastest pattern has two samples a period', () => {
    // Two points at ±r: the level goes with cos(2kr sin φ), whose phase turns by 2kr per radian at most.
    const perStepRad = 2 * ((2 * Math.PI) / 0.5) * 0.3 * (largestStepDeg(0.3, halfMetreHz) / (180 / Math.PI));
    expect(perStepRad).toBeCloseTo(Math.PI, 9);
  });

  it('judges nothing without size and offset, and needs neither at boresight alone', () => {
    expect(checkAngularStep(night({ expected: {} }), siteWithout('autOffsetM'))).toMatchObject({
      verdict: 'not-checked',
      text: 'give antenna.size in the plan, autOffset in the range file (0 m when the AUT turns about its middle)',
    });
    expect(checkAngularStep(night({ cuts: [], expected: {} }), siteWithout('autOffsetM')).verdict).toBe('go');
  });
});
