// Look-ahead, holding and overrides on the planner alone, against figures worked by hand.
import { describe, expect, it } from 'vitest';
import { alongPath, Planner } from '../../../../mocks/positioner/planner.ts';
import { Timeline } from '../../../../mocks/positioner/timeline.ts';

function bench(rate = 10, acceleration = 20): { timeline: Timeline; planner: Planner } {
  const timeline = new Timeline([0, 0, 0], [0, 0, 0]);
  const limits = { rate: [rate, rate, rate], acceleration: [acceleration, acceleration, acceleration] };
  return { timeline, planner: new Planner(timeline, () => limits) };
}

const feed = (x: number, y = 0, speed = 10) => ({ target: [x, y, 0], speed, rapid: false });

describe('Planner', () => {
  it('runs through moves in one line at speed', () => {
    const { timeline, planner } = bench();
    for (const x of [10, 20, 30]) planner.add(feed(x), 0);
    planner.start(0);
    // As one move of 30: 30/10 + 10/20 = 3.5 s.
    expect(timeline.endMs).toBeCloseTo(3500, 6);
    expect(timeline.speedAt(1250)).toBeCloseTo(10, 9);
    expect(timeline.placesAt(1250).counter[0]).toBeCloseTo(10, 9);
  });

  it('stops at a corner and at a turning back', () => {
    const { timeline, planner } = bench();
    planner.add(feed(10, 0), 0);
    planner.add(feed(10, 10), 0);
    planner.add(feed(10, 0), 0);
    planner.start(0);
    // Three moves of 10/10 + 10/20 = 1.5 s each.
    expect(timeline.endMs).toBeCloseTo(4500, 6);
    expect(timeline.speedAt(1500)).toBeCloseTo(0, 6);
    expect(timeline.placesAt(3000).counter).toEqual([10, 10, 0]);
  });

  it('raises the end speed of the move under way when another is queued behind it', () => {
    const { timeline, planner } = bench();
    planner.add(feed(10), 0);
    planner.start(0);
    expect(timeline.endMs).toBeCloseTo(1500, 6);
    planner.add(feed(20), 900);
    expect(timeline.endMs).toBeCloseTo(2500, 6);
    expect(timeline.speedAt(1400)).toBeCloseTo(10, 6);
  });

  it('joins moves of different feeds at the lower one', () => {
    const { timeline, planner } = bench();
    planner.add(feed(10, 0, 10), 0);
    planner.add(feed(12, 0, 2), 0);
    planner.start(0);
    // Up 0.5 s (2.5), cruise 5.1/10 s, down to 2 in 0.4 s (2.4); then 1.9 at 2 and 0.1 s to stop.
    expect(timeline.endMs).toBeCloseTo(1000 * (0.5 + 0.51 + 0.4 + 0.95 + 0.1), 6);
  });

  it('holds within v²/2a and goes on to the target afterwards', () => {
    const { timeline, planner } = bench();
    planner.add(feed(30), 0);
    planner.start(0);
    const { stopMs } = planner.hold(1000);
    // At 1 s: 2.5 + 0.5·10 = 7.5; stops 10²/40 = 2.5 further, after 0.5 s.
    expect(stopMs).toBeCloseTo(1500, 6);
    expect(timeline.placesAt(9999).counter[0]).toBeCloseTo(10, 9);
    planner.start(5000);
    // 20 left: 20/10 + 0.5 s.
    expect(timeline.endMs).toBeCloseTo(7500, 6);
    expect(timeline.placesAt(7500).counter[0]).toBe(30);
  });

  it('carries a hold over the border between two moves', () => {
    const { timeline, planner } = bench();
    planner.add(feed(8), 0);
    planner.add(feed(16), 0);
    planner.start(0);
    const { stopMs } = planner.hold(1000);
    expect(stopMs).toBeCloseTo(1500, 6);
    expect(timeline.placesAt(1500).counter[0]).toBeCloseTo(10, 9);
    planner.advance(1500);
    expect(planner.queued).toBe(1);
    planner.start(2000);
    // 6 left: 6/10 + 0.5 s.
    expect(timeline.endMs).toBeCloseTo(3100, 6);
  });

  it('counts a move as done when a hold comes to rest just behind its end', () => {
    const { timeline, planner } = bench();
    planner.add(feed(9.5), 0);
    planner.add(feed(16), 0);
    planner.start(0);
    planner.hold(1000);
    planner.advance(1500);
    expect(timeline.placesAt(1500).counter[0]).toBeCloseTo(10, 9);
    expect(planner.queued).toBe(1);
  });

  it('slows down when an override is lowered in motion', () => {
    const { timeline, planner } = bench();
    planner.add(feed(30), 0);
    planner.start(0);
    planner.feedFactor = 0.5;
    planner.replan(1000);
    // 7.5 done; 10 → 5 takes 0.25 s and 1.875; 5 → 0 takes 0.25 s and 0.625; 20 at 5/s.
    expect(timeline.endMs).toBeCloseTo(1000 + 250 + 4000 + 250, 6);
  });

  it('keeps past and future readable at any instant', () => {
    const { timeline, planner } = bench();
    planner.add(feed(10), 0);
    planner.start(100);
    planner.hold(800);
    expect(timeline.placesAt(0).counter[0]).toBe(0);
    // ½·20·0.3² at 0.4 s.
    expect(timeline.placesAt(400).counter[0]).toBeCloseTo(0.9, 9);
  });

  it('says that a move without length is none', () => {
    const { planner } = bench();
    expect(planner.add(feed(0), 0)).toBe(false);
    expect(planner.queued).toBe(0);
  });
});

describe('alongPath', () => {
  it('keeps every axis within its own limit', () => {
    expect(alongPath([0.6, 0.8], [6, 4])).toBeCloseTo(5, 12);
    expect(alongPath([1, 0], [6, 1])).toBe(6);
  });
});
