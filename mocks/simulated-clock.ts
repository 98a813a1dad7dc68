// Virtual time. Pending promises settle first (turns of the event loop), then time jumps to the earliest
// due moment; ties go in order of registration, so that one seed gives one history. Nothing due while
// something is awaited is a deadlock, reported with what was waited for. Only for in-memory links: real
// sockets know nothing of it, and every time-out would fire before their bytes arrive.
import { type Cancel, type Clock, nextTurn, sleepOn } from '../drivers/clock.ts';
import { DueQueue } from '../drivers/due-queue.ts';

/** Chains of promises may need a few turns of the event loop before they ask for time again. */
const patientTurns = 5;

export class SimulatedClock implements Clock {
  #nowMs = 0;
  #wallOffsetMs: number;
  #realWork = 0;
  #realDone: (() => void) | undefined;
  readonly #queue = new DueQueue();

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
    return this.#queue.push(Math.max(dueMs, this.#nowMs), act);
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
    let idleTurns = 0;
    for (;;) {
      await nextTurn();
      if (settled) return outcome;
      if (this.#realWork > 0) {
        await new Promise<void>((resolve) => {
          this.#realDone = resolve;
        });
        continue;
      }
      if (this.#step()) idleTurns = 0;
      else if (++idleTurns > patientTurns) {
        throw new Error(
          `simulated time stands at ${this.#nowMs} ms: something is awaited and nothing is due`,
        );
      }
    }
  }

  /** Acts on everything due at the earliest moment; false when nothing is due. */
  #step(): boolean {
    const earliestMs = this.#queue.earliestMs;
    if (earliestMs === undefined) return false;
    this.#nowMs = Math.max(this.#nowMs, earliestMs);
    for (let act = this.#queue.takeDue(this.#nowMs); act; act = this.#queue.takeDue(this.#nowMs)) act();
    return true;
  }
}
