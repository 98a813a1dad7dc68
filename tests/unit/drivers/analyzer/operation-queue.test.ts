import { describe, expect, it } from 'vitest';
import { OperationQueue } from '../../../../drivers/analyzer/operation-queue.ts';
import { failureOf } from '../../../support/analyzer-bench.ts';

describe('operations', () => {
  it('run one at a time in their order, whatever becomes of one', async () => {
    const queue = new OperationQueue();
    const seen: string[] = [];
    const work = (name: string) => async () => {
      seen.push(`${name} begins`);
      await Promise.resolve();
      seen.push(`${name} ends`);
      if (name === 'b') throw new Error('b failed');
      return name;
    };
    const all = await Promise.allSettled([queue.run(work('a')), queue.run(work('b')), queue.run(work('c'))]);
    expect(all.map(({ status }) => status)).toEqual(['fulfilled', 'rejected', 'fulfilled']);
    expect(seen).toEqual(['a begins', 'a ends', 'b begins', 'b ends', 'c begins', 'c ends']);
    expect(queue.isBusy).toBe(false);
  });

  it('are interrupted together, and what comes after is not', async () => {
    const queue = new OperationQueue();
    const reason = new Error('make way');
    const running = failureOf(
      queue.run(
        (stop) => new Promise((_, reject) => stop.addEventListener('abort', () => reject(stop.reason))),
      ),
    );
    let began = false;
    const waiting = failureOf(
      queue.run(async () => {
        began = true;
      }),
    );
    queue.interrupt(reason);
    const after = queue.run(async (stop) => stop.aborted);
    expect(await running).toBe(reason);
    expect(await waiting).toBe(reason);
    expect(await after).toBe(false);
    expect(began).toBe(false);
  });

  it('end with the signal of the caller, before or during', async () => {
    const queue = new OperationQueue();
    const giveUp = new AbortController();
    const work = (stop: AbortSignal) =>
      new Promise((_, reject) => stop.addEventListener('abort', () => reject(stop.reason)));
    const running = failureOf(queue.run(work, giveUp.signal));
    giveUp.abort(new Error('enough'));
    expect((await running).message).toBe('enough');
    expect((await failureOf(queue.run(async () => 1, giveUp.signal))).message).toBe('enough');
  });
});
