// The order of a positioner's operations, whatever its controller speaks: one at a time in the order asked for,
// a stop past all of them, and a stop behind every operation that failed in motion. Sends nothing itself.
import { DriverError, type DriverErrorCode, isDriverError } from '../errors.ts';
import type { StopReport } from './positioner.ts';

/** What of ours may be turning. */
export type Underway = 'nothing' | 'move' | 'homing';

export interface OperationTurnsOptions {
  /** Stops the axes; its first bytes leave before it returns. */
  stop: (underway: Underway) => Promise<StopReport>;
  /** Whether axes turn that we have not set in motion. */
  seenMoving: () => boolean;
  /** A motion of ours begins, or has come to rest. */
  expectMotion: (expected: boolean) => void;
  /** Failures after which nothing moves and nothing is queued, so that a stop would be pointless. */
  atRestAfter: readonly DriverErrorCode[];
}

export class OperationTurns {
  readonly #options: OperationTurnsOptions;
  #queue: Promise<unknown> = Promise.resolve();
  #operation: { ends: AbortController; ridesOutRestarts: boolean } | undefined;
  #stopping: Promise<StopReport> | undefined;
  #stops = 0;
  #underway: Underway = 'nothing';

  constructor(options: OperationTurnsOptions) {
    this.#options = options;
  }

  get underway(): Underway {
    return this.#underway;
  }

  /** Runs one operation after those before it; a fault or a stop ends it, and a move it leaves behind is stopped. */
  exclusive<T>(
    signal: AbortSignal | undefined,
    act: (signal: AbortSignal) => Promise<T>,
    { ridesOutRestarts = false } = {},
  ): Promise<T> {
    const stops = this.#stopping ? Number.NaN : this.#stops;
    const turn = this.#queue.then(async () => {
      if (stops !== this.#stops)
        throw new DriverError('POSITIONER_STOPPED', 'a stop came before this could begin');
      const ends = new AbortController();
      this.#operation = { ends, ridesOutRestarts };
      try {
        return await act(signal ? AbortSignal.any([signal, ends.signal]) : ends.signal);
      } catch (error) {
        throw await this.#clearUp(error);
      } finally {
        this.#operation = undefined;
      }
    });
    // The caller has the failure; the queue only keeps the order.
    this.#queue = turn.catch(() => {});
    return turn;
  }

  /** Throws POSITIONER_STOP_UNCONFIRMED. A second call while one is under way is told the same outcome. */
  stop(): Promise<StopReport> {
    this.#stopping ??= this.#stop().finally(() => {
      this.#stopping = undefined;
    });
    return this.#stopping;
  }

  /** Ends the operation under way. */
  fail(error: DriverError): void {
    this.#operation?.ends.abort(error);
  }

  /** A restart or an alarm: ends the operation under way, unless it expects such things. */
  fault(error: DriverError): void {
    if (!this.#operation?.ridesOutRestarts) this.fail(error);
  }

  moves(underway: Underway): void {
    this.#underway = underway;
    this.#options.expectMotion(true);
  }

  atRest(): void {
    this.#underway = 'nothing';
    this.#options.expectMotion(false);
  }

  async #stop(): Promise<StopReport> {
    this.#stops += 1;
    const isForeign = this.#underway === 'nothing' && this.#options.seenMoving();
    const underway = isForeign ? 'move' : this.#underway;
    const stopped = this.#options.stop(underway);
    this.fail(new DriverError('POSITIONER_STOPPED', 'stopped on request', { underway }));
    const report = await stopped;
    this.atRest();
    return report;
  }

  /** What to throw in the end: an operation that failed in motion is followed by a stop, unless that is pointless. */
  async #clearUp(error: unknown): Promise<unknown> {
    if (this.#underway === 'nothing' || this.#stopping) return error;
    // Held: the lock belongs to whoever stands at the machine.
    if (isDriverError(error, 'POSITIONER_HELD', 'LINK_CLOSED')) return error;
    if (isDriverError(error, ...this.#options.atRestAfter)) {
      this.atRest();
      return error;
    }
    try {
      await this.stop();
      return error;
    } catch (unconfirmed) {
      if (!isDriverError(unconfirmed)) return unconfirmed;
      return new DriverError(unconfirmed.code, unconfirmed.message, unconfirmed.facts, error);
    }
  }
}
