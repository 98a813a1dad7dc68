import { describe, expect, it } from 'vitest';
import { circularity } from '../../../../daemon/pattern/circularity.ts';
import { dropBelowPeak, floorBeside } from '../../../../daemon/pattern/floor.ts';
import { frontToBack } from '../../../../daemon/pattern/front-to-back.ts';
import { frontToRear } from '../../../../daemon/pattern/front-to-rear.ts';
import { peakOf } from '../../../../daemon/pattern/peak.ts';
import { byHand, part, turn } from './cut-samples.ts';

describe('a level beside the floor', () => {
  const floor = floorBeside(0, -60);

  it.each([
    [-30, { kind: 'value', value: 30 }],
    [-40, { kind: 'value', value: 40 }],
    [-41, { kind: 'value', value: 41, note: 'within 20 dB of the floor' }],
    [-56.9, { kind: 'value', value: 56.9, note: 'within 20 dB of the floor' }],
    [-57, { kind: 'bound', bound: 'lower', value: 57 }],
    [-75, { kind: 'bound', bound: 'lower', value: 60 }],
  ])('at %d dB over a floor of −60 dB', (levelDb, expected) => {
    expect(dropBelowPeak(0, levelDb, floor)).toMatchObject(expected);
    if (!('note' in expected) && expected.kind === 'value')
      expect(dropBelowPeak(0, levelDb, floor)).toEqual(expected);
  });

  it('has 120 dB below the peak for a floor when none is stated', () => {
    expect(dropBelowPeak(10, -109, floorBeside(10))).toEqual({ kind: 'value', value: 119 });
    expect(dropBelowPeak(10, -400, floorBeside(10))).toMatchObject({
      kind: 'bound',
      bound: 'lower',
      value: 120,
    });
  });
});

describe('front-to-back and front-to-rear', () => {
  const floor = floorBeside(0);
  // Behind, the level runs straight from −20 dB at 170° to −10 dB at 190°; lobe of −5 dB at 100°.
  const cut = byHand(
    [-170, -150, -100, -40, 0, 40, 100, 150, 170],
    [-10, -12, -30, -9, 0, -9, -5, -25, -20],
    true,
  );

  it('read the back between samples, linear in dB', () => {
    expect(frontToBack(cut, { ...peakOf(cut), angleDeg: 0, levelDb: 0 }, floor)).toEqual({
      kind: 'value',
      value: 15,
    });
    const turned = { ...peakOf(cut), angleDeg: 5, levelDb: 0 };
    expect(frontToBack(cut, turned, floor)).toEqual({ kind: 'value', value: 12.5 });
  });

  it('take the worst direction of the sector, edges included', () => {
    const peak = { ...peakOf(cut), angleDeg: 0, levelDb: 0 };
    // The lobe at −170°: slopes of 0.5 and −0.1 dB/° beside it lift its top by 0.2²/(4 × 0.015) = 2/3 dB.
    const narrow = frontToRear(cut, peak, floor, 20);
    expect(narrow.kind === 'value' && narrow.value).toBeCloseTo(10 - 2 / 3, 9);
    // Its top lies at 196.7°, outside ±15°; the sample at 190° is inside.
    const narrower = frontToRear(cut, peak, floor, 15);
    expect(narrower.kind === 'value' && narrower.value).toBeCloseTo(10, 9);
    // ±60°: the edge at 120° lies on the way from −5 dB at 100° to −25 dB at 150°.
    const wide = frontToRear(cut, peak, floor, 60);
    expect(wide.kind === 'value' && wide.value).toBeCloseTo(10 - 2 / 3, 9);
    const wider = frontToRear(cut, peak, floor, 75);
    expect(wider.kind === 'value' && wider.value).toBeCloseTo(7, 9);
    const widest = frontToRear(cut, peak, floor, 85);
    expect(widest.kind === 'value' && widest.value).toBeLessThanOrEqual(5);
  });

  it('are absent where the cut does not reach', () => {
    const short = part((deg) => -Math.abs(deg) / 10, -130, 130);
    expect(frontToBack(short, peakOf(short), floor)).toMatchObject({
      kind: 'absent',
      because: expect.stringContaining('180'),
    });
    expect(frontToRear(short, peakOf(short), floor).kind).toBe('absent');
    // Both edges of ±175° are measured, the back between them is not.
    expect(frontToRear(short, peakOf(short), floor, 175).kind).toBe('absent');
  });
});

describe('circularity', () => {
  it('is the largest minus the least level of a full turn', () => {
    const cut = turn((deg) => 2 + 0.5 * Math.cos((3 * deg * Math.PI) / 180));
    const found = circularity(cut, floorBeside(2.5));
    expect(found.kind === 'value' && found.value).toBeCloseTo(1, 9);
    expect(
      circularity(
        part(() => 0, -90, 90),
        floorBeside(0),
      ).kind,
    ).toBe('absent');
  });
});
