// The clock of the real world, in a few milliseconds, and the sleep that every clock shares.
import { describe, expect, it } from 'vitest';
import { nextTurn, SystemClock, sleepOn } from '../../../drivers/clock.ts';

describe('SystemClock', () => {
  const clock = new SystemClock();

  it('sleeps for about as long as it is told', async () => {
    const startMs = clock.monotonicMs();
    await clock.sleep(20);
    const tookMs = clock.monotonicMs() - startMs;
    expect(tookMs).toBeGreaterThan(18);
    expect(tookMs).toBeLessThan(2000);
  });

  it('tells wall time', () => {
    expect(Math.abs(clock.wallMs() - Date.now())).toBeLessThan(1000);
  });

  it('acts at a due moment, at once for a past one, never after a cancel', async () => {
    const acted: string[] = [];
    const nowMs = clock.monotonicMs();
    clock.at(nowMs + 30, () => acted.push('later'));
    clock.at(nowMs - 1000, () => acted.push('past'));
    const cancel = clock.at(nowMs + 5, () => acted.push('never'));
    cancel();
    await clock.sleep(60);
    expect(acted).toEqual(['past', 'later']);
  });

  it('lets no later moment overtake an earlier one, however close they are', async () => {
    const acted: number[] = [];
    const startMs = clock.monotonicMs() + 2;
    // Registered in another order than they are due, 10 µs apart, across the resolution of a timer.
    const places = Array.from({ length: 400 }, (_, i) => (i * 37) % 400);
    for (const place of places) clock.at(startMs + place / 100, () => acted.push(place));
    await clock.sleep(40);
    expect(acted).toEqual([...acted].sort((a, b) => a - b));
    expect(acted).toHaveLength(400);
  });

  it('never acts early', async () => {
    const early: number[] = [];
    const startMs = clock.monotonicMs();
    const waits = Array.from({ length: 50 }, (_, i) => i * 0.37);
    for (const waitMs of waits) {
      clock.at(startMs + waitMs, () => {
        if (clock.monotonicMs() < startMs + waitMs) early.push(waitMs);
      });
    }
    await clock.sleep(60);
    expect(early).toEqual([]);
  });

  it('ends a sleep as soon as it is aborted, with the reason', async () => {
    const abort = new AbortController();
    const startMs = clock.monotonicMs();
    const sleeping = clock.sleep(60_000, abort.signal);
    const reason = new Error('someone asked');
    abort.abort(reason);
    await expect(sleeping).rejects.toBe(reason);
    await expect(clock.sleep(60_000, abort.signal)).rejects.toBe(reason);
    expect(clock.monotonicMs() - startMs).toBeLessThan(2000);
  });

  it('hands real work on unchanged', async () => {
    expect(await clock.whileReal(Promise.resolve(7))).toBe(7);
  });
});

describe('sleepOn', () => {
  it('takes its timer back when aborted and its listener when done', async () => {
    let cancelled = 0;
    let act: (() => void) | undefined;
    const timer = {
      monotonicMs: () => 100,
      at: (dueMs: number, due: () => void) => {
        expect(dueMs).toBe(150);
        act = due;
        return () => {
          cancelled += 1;
        };
      },
    };
    const abort = new AbortController();
    const aborted = sleepOn(timer, 50, abort.signal);
    abort.abort('over');
    await expect(aborted).rejects.toBe('over');
    expect(cancelled).toBe(1);
    const second = new AbortController();
    const done = sleepOn(timer, 50, second.signal);
    act!();
    await done;
    second.abort('too late');
    expect(cancelled).toBe(1);
  });

  it('takes a negative length for none', async () => {
    let dueAt = Number.NaN;
    await sleepOn(
      {
        monotonicMs: () => 10,
        at: (dueMs, act) => {
          dueAt = dueMs;
          act();
          return () => {};
        },
      },
      -5,
    );
    expect(dueAt).toBe(10);
  });
});

describe('nextTurn', () => {
  it('comes after everything already resolved', async () => {
    const order: string[] = [];
    const turn = nextTurn().then(() => order.push('turn'));
    void Promise.resolve()
      .then(() => Promise.resolve())
      .then(() => order.push('promise'));
    await turn;
    expect(order).toEqual(['promise', 'turn']);
  });
});
