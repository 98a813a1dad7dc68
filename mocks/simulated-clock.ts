// Virtual time. Pending promises settle first (turns of the event loop), then time jumps to the earliest
// due moment; ties go in order of registration, so that one seed gives one history. Nothing due while
// something is awaited is a deadlock, reported with what was waited for. Only for in-memory links: real
// sockets know nothing of it, and every time-out would fire before their bytes arrive.
import { type Cancel, type Clock, nextTurn, sleepOn } from '../drivers/clock.ts';

interface Due {
  dueMs: number;
  order: number;
  act: () => void;
}

export class SimulatedClock implements Clock {
  #nowMs = 0;
  #wallOffsetMs: number;
  #order = 0;
  #realWork = 0;
  #realDone: (() => void) | undefined;
  readonly #queue: Due[] = [];

  /** `wallStartMs`: the wall time at which virtual time begins. */
  constructor(wallStartMs = 1_767_225_600_000) {
    this.#wallOffsetMs = wallStartMs;
  }

  monotonicMs(): number {
    return this.#nowMs;
  }

  wallMs(): number {
    return this.#wallOffsetMs + this.#nowMs;
  }

  /** Moves wall time alone, as a time server or daylight saving would. */
  jumpWall(byMs: number): void {
    this.#wallOffsetMs += byMs;
  }

  sleep(ms: number, signal?: AbortSignal): Promise<void> {
    return sleepOn(this, ms, signal);
  }

  at(dueMs: number, act: () => void): Cancel {
    const due: Due = { dueMs: Math.max(dueMs, this.#nowMs), order: this.#order++, act };
    pushDue(this.#queue, due);
    return () => {
      due.act = () => {};
    };
  }

  async whileReal<T>(work: Promise<T>): Promise<T> {
    this.#realWork += 1;
    try {
      return await work;
    } finally {
      this.#realWork -= 1;
      this.#realDone?.();
    }
  }

  /** Runs virtual time until `work` is settled and returns its outcome. */
  async run<T>(work: Promise<T>): Promise<T> {
    let settled = false;
    const outcome = work.finally(() => {
      settled = true;
    });
    outcome.catch(() => {});
    for (;;) {
      await nextTurn();
      if (settled) return outcome;
      if (this.#realWork > 0) {
        await new Promise<void>((resolve) => {
          this.#realDone = resolve;
        });
        continue;
      }
      if (!this.#step()) {
        // One more chance: promise chains longer than a turn.
        await nextTurn();
        if (settled) return outcome;
        if (this.#realWork === 0 && this.#queue.length === 0) {
          throw new Error(
            `simulated time stands at ${this.#nowMs} ms: something is awaited and nothing is due`,
          );
        }
      }
    }
  }

  /** Acts on everything due at the earliest moment; false when nothing is due. */
  #step(): boolean {
    const first = this.#queue[0];
    if (!first) return false;
    this.#nowMs = first.dueMs;
    while (this.#queue[0] && this.#queue[0].dueMs <= this.#nowMs) popDue(this.#queue)?.act();
    return true;
  }
}

function before(a: Due, b: Due): boolean {
  return a.dueMs < b.dueMs || (a.dueMs === b.dueMs && a.order < b.order);
}

function pushDue(heap: Due[], due: Due): void {
  let at = heap.push(due) - 1;
  while (at > 0) {
    const parent = (at - 1) >> 1;
    if (!before(due, heap[parent]!)) break;
    heap[at] = heap[parent]!;
    at = parent;
  }
  heap[at] = due;
}

function popDue(heap: Due[]): Due | undefined {
  const top = heap[0];
  const last = heap.pop();
  if (!top || !last || heap.length === 0) return top;
  let at = 0;
  for (;;) {
    let child = 2 * at + 1;
    if (child >= heap.length) break;
    if (child + 1 < heap.length && before(heap[child + 1]!, heap[child]!)) child += 1;
    if (!before(heap[child]!, last)) break;
    heap[at] = heap[child]!;
    at = child;
  }
  heap[at] = last;
  return top;
}
