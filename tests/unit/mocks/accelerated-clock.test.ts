// The faster clock over simulated time: due moments, wall time, aborts, and a timer that fires too early.
import { describe, expect, it } from 'vitest';
import type { Clock } from '../../../drivers/clock.ts';
import { AcceleratedClock } from '../../../mocks/accelerated-clock.ts';
import { SimulatedClock } from '../../../mocks/simulated-clock.ts';

describe('AcceleratedClock', () => {
  it('passes ten of its seconds in one of the clock below', async () => {
    const base = new SimulatedClock(5_000_000);
    await base.run(base.sleep(400));
    const fast = new AcceleratedClock(base, 10);
    expect(fast.monotonicMs()).toBe(400);
    await base.run(fast.sleep(10_000));
    expect(base.monotonicMs()).toBeCloseTo(1400, 9);
    expect(fast.monotonicMs()).toBeCloseTo(10_400, 6);
    expect(fast.wallMs() - 5_000_400).toBeCloseTo(10_000, 6);
  });

  it('acts in the order of due moments, and not at all when cancelled', async () => {
    const base = new SimulatedClock();
    const fast = new AcceleratedClock(base, 4);
    const acted: string[] = [];
    fast.at(200, () => acted.push('second'));
    fast.at(100, () => acted.push('first'));
    const cancel = fast.at(150, () => acted.push('never'));
    cancel();
    await base.run(fast.sleep(300));
    expect(acted).toEqual(['first', 'second']);
    expect(base.monotonicMs()).toBeCloseTo(75, 9);
  });

  it('rejects an aborted sleep with the reason', async () => {
    const base = new SimulatedClock();
    const fast = new AcceleratedClock(base, 4);
    const abort = new AbortController();
    const sleeping = fast.sleep(1000, abort.signal);
    base.at(10, () => abort.abort(new Error('enough')));
    await expect(base.run(sleeping)).rejects.toThrow('enough');
    expect(base.monotonicMs()).toBe(10);
  });

  it('waits again when the timer below fires too early', () => {
    let nowMs = 0;
    const pending: (() => void)[] = [];
    const early: Clock = {
      monotonicMs: () => nowMs,
      wallMs: () => nowMs,
      sleep: () => Promise.resolve(),
      at: (_, act) => {
        pending.push(act);
        return () => {};
      },
      whileReal: (work) => work,
    };
    let acted = 0;
    new AcceleratedClock(early, 100).at(1000, () => {
      acted += 1;
    });
    nowMs = 9.6;
    pending.shift()!();
    expect(acted).toBe(0);
    nowMs = 10;
    pending.shift()!();
    expect(acted).toBe(1);
  });
});
