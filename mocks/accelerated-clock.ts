// A clock that runs faster than the one below it, by a constant factor: for both simulated devices of a
// demonstration, so that moves and sweeps of minutes pass in seconds. It never acts before the due moment,
// which a timer underneath may do by a fraction of a millisecond.
import { type Cancel, type Clock, sleepOn } from '../drivers/clock.ts';

export class AcceleratedClock implements Clock {
  readonly #base: Clock;
  readonly #factor: number;
  readonly #baseStartMs: number;
  readonly #wallStartMs: number;

  /** `factor` above 0: this many milliseconds here for each one of `base`. Time begins at that of `base`. */
  constructor(base: Clock, factor: number) {
    this.#base = base;
    this.#factor = factor;
    this.#baseStartMs = base.monotonicMs();
    this.#wallStartMs = base.wallMs();
  }

  monotonicMs(): number {
    return this.#baseStartMs + this.#elapsedMs();
  }

  /** Runs ahead of the world's wall time, as it must; a jump of the world's wall time is not followed. */
  wallMs(): number {
    return this.#wallStartMs + this.#elapsedMs();
  }

  sleep(ms: number, signal?: AbortSignal): Promise<void> {
    return sleepOn(this, ms, signal);
  }

  at(dueMs: number, act: () => void): Cancel {
    const baseDueMs = this.#baseStartMs + (dueMs - this.#baseStartMs) / this.#factor;
    let cancel = this.#base.at(baseDueMs, fire);
    const base = this.#base;
    function fire(): void {
      if (base.monotonicMs() < baseDueMs - 1e-9 * Math.abs(baseDueMs)) cancel = base.at(baseDueMs, fire);
      else act();
    }
    return () => cancel();
  }

  whileReal<T>(work: Promise<T>): Promise<T> {
    return this.#base.whileReal(work);
  }

  #elapsedMs(): number {
    return (this.#base.monotonicMs() - this.#baseStartMs) * this.#factor;
  }
}
