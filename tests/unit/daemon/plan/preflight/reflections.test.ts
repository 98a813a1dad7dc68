// By hand: 8 m apart and 3 m up, the way by the ground is 10 m: 2 m longer and 20 log 0.8 = −1.938 dB. A band of
// c/1 m resolves 1 m, 1.586 m behind the window; one of c/2 m resolves 3.172 m.
import { describe, expect, it } from 'vitest';
import {
  checkGroundBounce,
  checkWallEcho,
  distanceForExcessM,
} from '../../../../../daemon/plan/preflight/reflections.ts';
import { night, oneMetreHz, site, siteWithout } from './site.ts';

const narrow = { startHz: oneMetreHz, stopHz: 1.5 * oneMetreHz, points: 101 };

describe.each([
  ['ground', checkGroundBounce, 'raise both antennas to'],
  ['a wall', checkWallEcho, 'keep walls'],
] as const)('the echo of %s', (_, check, advice) => {
  it('is told with its level, its way and its ripple', () => {
    const { facts, verdict, text } = check(night(), site());
    expect(facts['excessM']).toBeCloseTo(2, 9);
    expect(facts['echoDb']).toBeCloseTo(-1.938, 3);
    expect(facts['resolutionM']).toBeCloseTo(1.586, 3);
    // 20 log 1.8 and 20 log 0.2.
    expect(facts['risesDb']).toBeCloseTo(5.105, 3);
    expect(facts['fallsDb']).toBeCloseTo(-13.979, 3);
    expect(verdict).toBe('caution');
    expect(text).toContain('every 149.896 MHz');
    expect(text).toContain('gating could part them');
  });

  it('says what a band that cannot part the ways would need', () => {
    const { text, change } = check(night({ band: narrow }), site());
    expect(text).toContain('gating could not part them');
    // ½√(11.1717² − 8²) = 3.899; 1.586·c/2 m = 237.71 MHz.
    expect(change).toContain(`${advice} 3.90 m`);
    expect(change).toContain('widen the band to 238 MHz');
  });

  it('does no harm from very far away', () => {
    // 160 m up or aside: 320.1 m against 8 m, −32 dB.
    const far = { heights: { rangeAntennaM: 160, autM: 160 }, nearestWallM: 160 };
    expect(check(night(), site(far)).verdict).toBe('go');
  });
});

describe('heights', () => {
  it('that differ count along the ground', () => {
    // 10 m between 2 m and 8 m: 8 m along, the way by the ground is √(64 + 100).
    const heights = { rangeAntennaM: 2, autM: 8 };
    const { facts } = checkGroundBounce(night(), site({ rangeLengthM: 10, heights }));
    expect(facts['excessM']).toBeCloseTo(Math.sqrt(164) - 10, 9);
  });

  it('that differ by more than the range is long are wrong', () => {
    const heights = { rangeAntennaM: 12, autM: 3 };
    expect(checkGroundBounce(night(), site({ heights }))).toMatchObject({ verdict: 'no-go' });
  });

  it('that are not given are asked for, as are walls', () => {
    expect(checkGroundBounce(night(), siteWithout('heights')).text).toBe('give heights in the range file');
    expect(checkWallEcho(night(), siteWithout('nearestWallM'))).toMatchObject({
      verdict: 'not-checked',
      text: 'give nearestWall in the range file',
    });
  });

  it('found for an excess path give it back', () => {
    const heightM = distanceForExcessM(8, 2);
    expect(heightM).toBeCloseTo(3, 9);
  });
});
