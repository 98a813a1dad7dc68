import { describe, expect, it } from 'vitest';
import { checkTravel } from '../../../../../daemon/plan/preflight/travel.ts';
import { axis, cut, elevation } from '../planned.ts';
import { night, site } from './site.ts';

const withAxes = (...axes: ReturnType<typeof axis>[]) => site({ positioner: { ...site().positioner, axes } });

describe('travel', () => {
  it('is told with the approach and the longest turn back', () => {
    const { finding, run } = checkTravel(night(), site());
    // Approached from 2° below; 180° back to the tie at boresight take 180/20 + 20/40 s.
    expect(finding).toMatchObject({
      verdict: 'go',
      facts: { azimuthMinDeg: -182, azimuthMaxDeg: 180, azimuthLongestTurnDeg: 180 },
    });
    expect(finding.text).toContain('azimuth uses −182° to 180° of −200° to 200°');
    expect(finding.text).toContain('longest single turn 180° in 10 s');
    expect(finding.text).toContain('elevation rests at 0°');
    // 73 samples with the closure, ties before, after 60 and at the end.
    expect(run?.steps).toHaveLength(76);
  });

  it('tells every cut that does not fit, and what to do', () => {
    const cuts = [
      cut({ name: 'round' }),
      cut({ name: 'tilt', axis: 'elevation', fromDeg: -20, toDeg: 20, stepDeg: 10 }),
      cut({ name: 'roll', axis: 'roll' }),
    ];
    const { finding, run } = checkTravel(
      night({ cuts }),
      withAxes(axis({ travelMaxDeg: 170, travelMinDeg: -170 }), elevation()),
    );
    expect(run).toBeUndefined();
    expect(finding.verdict).toBe('no-go');
    expect(finding.facts).toEqual({ cutsRefused: 3 });
    for (const name of ['round', 'tilt', 'roll']) expect(finding.text).toContain(`cut ${name}: `);
    expect(finding.change).toContain('narrow the cut');
    expect(finding.change).toContain('its axes are azimuth, elevation');
  });

  it('of a run at boresight is nothing', () => {
    const { finding, run } = checkTravel(night({ kind: 'reference', cuts: [] }), site());
    expect(finding.verdict).toBe('go');
    expect(run?.steps).toHaveLength(5);
  });
});
