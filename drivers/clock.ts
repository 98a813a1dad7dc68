// Time, as everything else receives it. A clock is an outside device like any other: it is handed in,
// so that the same code runs in real time and in a simulated night. This is the only file that touches
// timers or dates; the linter refuses them everywhere else.
import { DueQueue } from './due-queue.ts';

export type Cancel = () => void;

export interface Clock {
  /** Milliseconds that never run backwards; the origin has no meaning. For durations and deadlines. */
  monotonicMs(): number;
  /** Milliseconds since 1970-01-01 UTC; may jump. For stamps and schedules. */
  wallMs(): number;
  /** Resolves after `ms`; rejects with `signal.reason` as soon as the signal is aborted. */
  sleep(ms: number, signal?: AbortSignal): Promise<void>;
  /** Calls `act` once when `monotonicMs()` reaches `dueMs` (at the next turn when it is already past). */
  at(dueMs: number, act: () => void): Cancel;
  /**
   * Awaits work that takes real time (a worker, a file). A simulated clock makes no jump while such work
   * is pending; a real clock simply waits.
   */
  whileReal<T>(work: Promise<T>): Promise<T>;
}

/** A turn of the event loop: everything already resolved has run when it returns. */
export function nextTurn(): Promise<void> {
  return new Promise((resolve) => setImmediate(resolve));
}

/** `clock.sleep` expressed by `clock.at`; shared by every implementation of Clock. */
export function sleepOn(
  clock: Pick<Clock, 'monotonicMs' | 'at'>,
  ms: number,
  signal?: AbortSignal,
): Promise<void> {
  return new Promise((resolve, reject) => {
    if (signal?.aborted) return reject(signal.reason);
    const cancel = clock.at(clock.monotonicMs() + Math.max(0, ms), () => {
      signal?.removeEventListener('abort', onAbort);
      resolve();
    });
    function onAbort(): void {
      cancel();
      reject(signal?.reason);
    }
    signal?.addEventListener('abort', onAbort, { once: true });
  });
}

/**
 * Real time. Acts happen in the order of their moments, never early; what is due within a millisecond, the
 * resolution of a timer, is met by turns of the event loop.
 */
export class SystemClock implements Clock {
  readonly #queue = new DueQueue();
  #disarm: Cancel = () => {};
  #armedForMs = Number.POSITIVE_INFINITY;

  monotonicMs(): number {
    return performance.now();
  }

  wallMs(): number {
    return Date.now();
  }

  sleep(ms: number, signal?: AbortSignal): Promise<void> {
    return sleepOn(this, ms, signal);
  }

  at(dueMs: number, act: () => void): Cancel {
    const cancel = this.#queue.push(dueMs, act);
    this.#arm();
    return () => {
      cancel();
      this.#arm();
    };
  }

  whileReal<T>(work: Promise<T>): Promise<T> {
    return work;
  }

  /** One timer for the earliest act; none when nothing waits, so that the process may end. */
  #arm(): void {
    const earliestMs = this.#queue.earliestMs ?? Number.POSITIVE_INFINITY;
    if (earliestMs === this.#armedForMs) return;
    this.#disarm();
    this.#armedForMs = earliestMs;
    if (earliestMs !== Number.POSITIVE_INFINITY) this.#wait();
  }

  #wait(): void {
    const leftMs = this.#armedForMs - this.monotonicMs();
    if (leftMs < 1) {
      const turn = setImmediate(() => this.#wake());
      this.#disarm = () => clearImmediate(turn);
    } else {
      const timer = setTimeout(() => this.#wake(), Math.min(leftMs, longestTimerMs));
      this.#disarm = () => clearTimeout(timer);
    }
  }

  #wake(): void {
    if (this.monotonicMs() < this.#armedForMs) {
      this.#wait();
      return;
    }
    this.#armedForMs = Number.POSITIVE_INFINITY;
    try {
      this.#queue.takeDue(this.monotonicMs())?.();
    } finally {
      this.#arm();
    }
  }
}

/** Node's timers hold no more than 2^31 − 1 ms. */
const longestTimerMs = 2 ** 31 - 1;
