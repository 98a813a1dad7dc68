// One line on its way to its `ok`: what came meanwhile, and its end by answer, deadline or signal. A `busy` line
// puts the deadline off. Judges nothing; the sender says which line ends it.
import type { Cancel, Clock } from '../clock.ts';
import { DriverError } from '../errors.ts';
import { unansweredLine } from './report-failures.ts';
import type { ReportLine } from './report-lines.ts';

export interface ReportLineOptions {
  withinMs: number;
  /** `busy` lines put the deadline off, but not beyond this; absent: a quarter of an hour. */
  limitMs?: number;
  signal?: AbortSignal | undefined;
  /** Called right before the bytes leave, when both sides are in step. */
  onSend?: () => void;
  /** An `ok` without a position before it belongs to another line. */
  needsPosition?: boolean;
}

export interface ReportExchangeParts extends ReportLineOptions {
  text: string;
  /** Absent for the few lines that go without. */
  number?: number;
  /** The echo that must precede the `ok`. */
  token?: string;
  /** The line before may never have arrived: the controller may ask for its number instead. */
  mayStepBack?: boolean;
}

const busyMs = 5_000;
const usualLimitMs = 900_000;

export class ReportExchange {
  readonly parts: ReportExchangeParts;
  readonly lines: ReportLine[] = [];
  readonly outcome: Promise<ReportLine[]>;
  number: number | undefined;
  resends = 0;
  /** A resend was asked for and not yet served: an `ok` now belongs to the request. */
  isResending = false;
  readonly #clock: Clock;
  readonly #link: string;
  readonly #startedMs: number;
  readonly #onEnd: (failed: boolean) => void;
  readonly #onAbort: () => void;
  #dueMs: number;
  #cancel: Cancel = () => {};
  #resolve: (lines: ReportLine[]) => void = () => {};
  #reject: (why: unknown) => void = () => {};

  constructor(parts: ReportExchangeParts, clock: Clock, link: string, onEnd: (failed: boolean) => void) {
    this.parts = parts;
    this.number = parts.number;
    this.#clock = clock;
    this.#link = link;
    this.#onEnd = onEnd;
    this.#startedMs = clock.monotonicMs();
    this.#dueMs = this.#startedMs + parts.withinMs;
    this.outcome = new Promise((resolve, reject) => {
      this.#resolve = resolve;
      this.#reject = reject;
    });
    this.#onAbort = () => this.fail(parts.signal?.reason);
    parts.signal?.addEventListener('abort', this.#onAbort, { once: true });
    this.#arm();
  }

  get hasPosition(): boolean {
    return this.lines.some((line) => line.kind === 'position');
  }

  /** A sign of life: the deadline is put off. */
  extend(): void {
    const limitMs = this.#startedMs + (this.parts.limitMs ?? usualLimitMs);
    this.#dueMs = Math.max(this.#dueMs, Math.min(this.#clock.monotonicMs() + busyMs, limitMs));
    this.#arm();
  }

  /** True when the deadline passed although the controller kept saying that it was busy. */
  get wasBusy(): boolean {
    return this.lines.some((line) => line.kind === 'busy');
  }

  finish(): void {
    this.#end(false);
    this.#resolve(this.lines);
  }

  fail(why: unknown): void {
    this.#end(true);
    this.#reject(why);
  }

  #arm(): void {
    this.#cancel();
    this.#cancel = this.#clock.at(this.#dueMs, () => this.#late());
  }

  #late(): void {
    const waitedMs = this.#dueMs - this.#startedMs;
    const beyond = this.wasBusy && waitedMs >= (this.parts.limitMs ?? usualLimitMs);
    this.fail(
      beyond
        ? new DriverError(
            'POSITIONER_STALLED',
            `${this.#link} is busy with ${this.parts.text} and does not end`,
            {
              line: this.parts.text,
              waitedMs,
            },
          )
        : unansweredLine(this.parts.text, waitedMs, this.#link),
    );
  }

  #end(failed: boolean): void {
    this.#cancel();
    this.parts.signal?.removeEventListener('abort', this.#onAbort);
    this.#onEnd(failed);
  }
}
