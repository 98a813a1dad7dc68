// Gear play, lost steps and stalls: what the shaft does while the counter believes otherwise.
import { describe, expect, it } from 'vitest';
import { Stage } from '../../../../mocks/positioner/mechanics.ts';
import { Planner } from '../../../../mocks/positioner/planner.ts';
import { Timeline } from '../../../../mocks/positioner/timeline.ts';

function axis(play: number): {
  timeline: Timeline;
  go: (target: number, atMs: number) => number;
  planner: Planner;
} {
  const timeline = new Timeline([play], [0]);
  const planner = new Planner(timeline, () => ({ rate: [10], acceleration: [20] }));
  const go = (target: number, atMs: number): number => {
    planner.advance(atMs);
    planner.add({ target: [target], speed: 10, rapid: false }, atMs);
    planner.start(atMs);
    return timeline.endMs;
  };
  return { timeline, go, planner };
}

describe('gear play', () => {
  it('lets the shaft lag by the play after the direction has turned', () => {
    const { timeline, go } = axis(0.5);
    let ms = go(10, 0);
    expect(timeline.placesAt(ms).shaft[0]).toBeCloseTo(10, 9);
    ms = go(8, ms);
    expect(timeline.placesAt(ms).counter[0]).toBe(8);
    expect(timeline.placesAt(ms).shaft[0]).toBeCloseTo(8.5, 9);
    ms = go(7.9, ms);
    expect(timeline.placesAt(ms).shaft[0]).toBeCloseTo(8.4, 9);
    // Half of the play taken up again: the shaft rests.
    ms = go(8.2, ms);
    expect(timeline.placesAt(ms).shaft[0]).toBeCloseTo(8.4, 9);
    ms = go(9, ms);
    expect(timeline.placesAt(ms).shaft[0]).toBeCloseTo(9, 9);
  });

  it('keeps the shaft still at first within a returning move', () => {
    const { timeline, go } = axis(0.5);
    const ms = go(10, 0);
    go(0, ms);
    // ½·20·t² = 0.5 at t = √0.05 s: until then nothing turns.
    const freeMs = ms + 1000 * Math.sqrt(0.05);
    expect(timeline.placesAt(freeMs - 1).shaft[0]).toBeCloseTo(10, 9);
    expect(timeline.placesAt(freeMs + 50).shaft[0]).toBeLessThan(9.9);
  });
});

describe('lost steps and stalls', () => {
  it('shifts the shaft for good and not the counter', () => {
    const { timeline, go, planner } = axis(0);
    go(10, 0);
    planner.disturb(700, () => timeline.slip(700, 0, -1.5));
    planner.advance(2000);
    const ms = go(20, 2000);
    expect(timeline.placesAt(ms).counter[0]).toBe(20);
    expect(timeline.placesAt(ms).shaft[0]).toBeCloseTo(18.5, 9);
    // The disturbed move took as long as an undisturbed one: 10/10 + 0.5 s.
    expect(timeline.placesAt(1500).counter[0]).toBe(10);
    expect(timeline.placesAt(1490).counter[0]).toBeLessThan(10);
  });

  it('leaves a stalled motor where it is and the past as it was', () => {
    const { timeline, go, planner } = axis(0);
    go(10, 0);
    planner.disturb(1000, () => {
      timeline.follow[0] = 0;
    });
    // 2.5 + 10·0.5 at 1 s.
    expect(timeline.placesAt(1500).counter[0]).toBe(10);
    expect(timeline.placesAt(1500).shaft[0]).toBeCloseTo(7.5, 9);
    timeline.follow[0] = 1;
    const ms = go(20, 2000);
    expect(timeline.placesAt(ms).shaft[0]).toBeCloseTo(17.5, 9);
    expect(timeline.placesAt(750).shaft[0]).toBeCloseTo(5, 9);
  });
});

describe('Stage', () => {
  it('maps units to degrees per axis and sees a wrong steps setting', () => {
    const stage = new Stage(3, {
      X: { unitsPerDegree: 2, zeroDeg: 5, stepsPerUnit: 80 },
      Y: { unitsPerDegree: -1 },
    });
    expect(stage.pose([20, 3, 7])).toEqual({ azimuthDeg: 15, elevationDeg: -3, rollDeg: 7 });
    // Set to 88.889 steps where the drive has 80: it turns a ninth too far.
    expect(stage.follow([800 / 9, 80, 80])[0]).toBeCloseTo(10 / 9, 12);
  });
});
