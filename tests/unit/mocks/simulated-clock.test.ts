// Virtual time: order, jumps, deadlock, real work, aborts and wall time.
import * as fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { SimulatedClock } from '../../../mocks/simulated-clock.ts';

describe('SimulatedClock', () => {
  it('jumps to the earliest due moment and acts in order, ties in order of registration', async () => {
    const clock = new SimulatedClock();
    const acted: string[] = [];
    clock.at(20, () => acted.push('c'));
    clock.at(10, () => acted.push('a'));
    clock.at(10, () => acted.push('b'));
    await clock.run(clock.sleep(20));
    expect(acted).toEqual(['a', 'b', 'c']);
    expect(clock.monotonicMs()).toBe(20);
  });

  it('keeps that order for any due moments', async () => {
    await fc.assert(
      fc.asyncProperty(fc.array(fc.integer({ min: 0, max: 20 }), { maxLength: 60 }), async (dues) => {
        const clock = new SimulatedClock();
        const acted: [due: number, order: number][] = [];
        dues.forEach((due, order) => void clock.at(due, () => void acted.push([due, order])));
        await clock.run(clock.sleep(25));
        const expected = dues
          .map((due, order) => [due, order])
          .sort((a, b) => a[0]! - b[0]! || a[1]! - b[1]!);
        expect(acted).toEqual(expected);
      }),
    );
  });

  it('acts on what becomes due at the same moment, and moves a past due moment to now', async () => {
    const clock = new SimulatedClock();
    const acted: number[] = [];
    clock.at(10, () => {
      clock.at(3, () => acted.push(clock.monotonicMs()));
    });
    await clock.run(clock.sleep(10));
    await clock.run(clock.sleep(0));
    expect(acted).toEqual([10]);
  });

  it('lets promises settle before it jumps', async () => {
    const clock = new SimulatedClock();
    const seen: number[] = [];
    const work = (async () => {
      await clock.sleep(5);
      for (let count = 0; count < 50; count += 1) await Promise.resolve();
      seen.push(clock.monotonicMs());
      await clock.sleep(5);
      seen.push(clock.monotonicMs());
    })();
    clock.at(7, () => seen.push(-7));
    await clock.run(work);
    expect(seen).toEqual([5, -7, 10]);
  });

  it('reports a deadlock with the moment it stands at', async () => {
    const clock = new SimulatedClock();
    await clock.run(clock.sleep(42));
    await expect(clock.run(new Promise(() => {}))).rejects.toThrow(/42 ms.*nothing is due/);
  });

  it('hands the failure of the work on', async () => {
    const clock = new SimulatedClock();
    await expect(
      clock.run(
        clock.sleep(5).then(() => {
          throw new Error('broken');
        }),
      ),
    ).rejects.toThrow('broken');
  });

  it('makes no jump while real work is pending', async () => {
    const clock = new SimulatedClock();
    let rang = false;
    clock.at(1000, () => {
      rang = true;
    });
    const result = clock.run(
      clock.whileReal(
        new Promise<string>((resolve) => {
          setTimeout(() => resolve(rang ? 'rang' : 'quiet'), 30);
        }),
      ),
    );
    expect(await result).toBe('quiet');
    expect(clock.monotonicMs()).toBe(0);
  });

  it('counts real work of several at once', async () => {
    const clock = new SimulatedClock();
    const realDelay = (ms: number): Promise<void> => new Promise((resolve) => setTimeout(resolve, ms));
    clock.at(500, () => {});
    await clock.run(Promise.all([clock.whileReal(realDelay(5)), clock.whileReal(realDelay(40))]));
    expect(clock.monotonicMs()).toBe(0);
  });

  it('rejects an aborted sleep at once with the reason, before and during', async () => {
    const clock = new SimulatedClock();
    const abort = new AbortController();
    clock.at(30, () => abort.abort(new Error('stop')));
    await expect(clock.run(clock.sleep(1000, abort.signal))).rejects.toThrow('stop');
    expect(clock.monotonicMs()).toBe(30);
    await expect(clock.run(clock.sleep(1000, abort.signal))).rejects.toThrow('stop');
    expect(clock.monotonicMs()).toBe(30);
  });

  it('leaves no mark of a cancelled act', async () => {
    const clock = new SimulatedClock();
    let rang = false;
    const cancel = clock.at(5, () => {
      rang = true;
    });
    cancel();
    await clock.run(clock.sleep(10));
    expect(rang).toBe(false);
  });

  it('moves wall time alone', async () => {
    const clock = new SimulatedClock(1_000_000);
    const sleeping = clock.sleep(100);
    clock.jumpWall(-3_600_000);
    await clock.run(sleeping);
    expect(clock.monotonicMs()).toBe(100);
    expect(clock.wallMs()).toBe(1_000_000 - 3_600_000 + 100);
  });
});
