// One exchange at a time over a link: a message out, its answer in, within a deadline. Knows bytes and
// time; whether question and answer still belong together is judged by the session above, which hears of
// everything that does not fit: bytes nobody asked for, deadlines that passed, a link that closed.
import type { Cancel, Clock } from '../clock.ts';
import { DriverError } from '../errors.ts';
import type { Link, LinkClosed } from '../link/link.ts';
import { type Expected, isSilence, ScpiReader } from './scpi-reader.ts';
import { excerpt, hexOf } from './scpi-values.ts';

export interface TrafficNote {
  direction: 'sent' | 'received';
  bytes: Uint8Array;
  monotonicMs: number;
}

export type Answer = { kind: 'text'; text: string } | { kind: 'block'; data: Uint8Array };

export interface WireEvents {
  onTraffic?: ((note: TrafficNote) => void) | undefined;
  /** Bytes that no question explains, or the end of trust in the present one. */
  onDoubt: (because: string) => void;
  onClosed: (news: LinkClosed) => void;
}

export interface Exchange {
  /** Without line end; none to read one more answer without asking. */
  message?: string;
  /** None for a command, which is never answered. */
  expected?: Expected;
  /** Silence longer than this ends the wait; each byte that comes extends it. */
  timeoutMs: number;
  signal?: AbortSignal | undefined;
}

/** However slowly bytes trickle in, an answer is not waited for longer than this many silences … */
const silencesAtMost = 3;
/** … and the time its largest size takes at this rate. */
const slowestBytesPerMs = 10;

/**
 * What becomes of bytes that no question is waiting for. `deaf`: thrown away (just opened); `proving`:
 * kept for the next read (lines of before may still come); `strict`: a reason for doubt.
 */
export type Attention = 'deaf' | 'proving' | 'strict';

interface Pending {
  exchange: Exchange;
  reader: ScpiReader | undefined;
  dueMs: number;
  latestMs: number;
  cancelTimer: Cancel;
  release: () => void;
  resolve: (answer: Answer | undefined) => void;
  reject: (error: unknown) => void;
}

export class ScpiWire {
  readonly #link: Link;
  readonly #clock: Clock;
  readonly #events: WireEvents;
  #pending: Pending | undefined;
  #kept = new Uint8Array(0);
  #attention: Attention = 'deaf';

  constructor(link: Link, clock: Clock, events: WireEvents) {
    this.#link = link;
    this.#clock = clock;
    this.#events = events;
    link.received$.subscribe((bytes) => this.#receive(bytes));
    link.closed$.subscribe((news) => this.#onClosed(news));
  }

  /** Bytes were kept that no exchange has taken. */
  get holdsRest(): boolean {
    return !this.#kept.every(isSilence);
  }

  get isOpen(): boolean {
    return this.#link.isOpen;
  }

  /** Opens, throws what the link throws. What comes before `attend` is thrown away. */
  async open(signal?: AbortSignal): Promise<void> {
    this.#kept = new Uint8Array(0);
    this.#attention = 'deaf';
    await this.#link.open(signal);
  }

  attend(attention: Attention): void {
    this.#attention = attention;
    if (attention !== 'proving') this.#kept = new Uint8Array(0);
  }

  close(): Promise<void> {
    return this.#link.close();
  }

  /** Ends the exchange that is under way, if there is one. */
  abandon(error: unknown): void {
    if (this.#pending) this.#settle(this.#pending, { error });
  }

  /** Gives the exchange under way no more than `ms` from now. */
  hurry(ms: number): void {
    const pending = this.#pending;
    if (!pending) return;
    pending.latestMs = Math.min(pending.latestMs, this.#clock.monotonicMs() + ms);
    pending.dueMs = Math.min(pending.dueMs, pending.latestMs);
    this.#armTimer(pending);
  }

  /** Sends a message without waiting for anything, past the exchange under way. */
  shout(message: string): Promise<void> {
    return this.#write(message);
  }

  /**
   * Throws ANALYZER_NOT_ANSWERING, ANALYZER_BAD_ANSWER, ANALYZER_BAD_BLOCK, ANALYZER_OUT_OF_STEP,
   * LINK_CLOSED, LINK_TIMEOUT, or the reason of the signal.
   */
  exchange(exchange: Exchange): Promise<Answer | undefined> {
    if (this.#pending) return Promise.reject(new Error('defect: two exchanges at a time on one session'));
    if (exchange.signal?.aborted) return Promise.reject(exchange.signal.reason);
    return new Promise((resolve, reject) => {
      const { message, expected, timeoutMs, signal } = exchange;
      const nowMs = this.#clock.monotonicMs();
      const onAbort = (): void => this.#abort(pending, signal?.reason);
      const pending: Pending = {
        exchange,
        reader:
          expected && new ScpiReader(message === undefined ? expected : { ...expected, question: message }),
        dueMs: nowMs + timeoutMs,
        latestMs: nowMs + silencesAtMost * timeoutMs + (expected?.maxBytes ?? 0) / slowestBytesPerMs,
        cancelTimer: () => {},
        release: () => signal?.removeEventListener('abort', onAbort),
        resolve,
        reject,
      };
      this.#pending = pending;
      signal?.addEventListener('abort', onAbort, { once: true });
      this.#armTimer(pending);
      this.#begin(pending);
    });
  }

  #begin(pending: Pending): void {
    const { message, expected } = pending.exchange;
    if (message !== undefined) {
      this.#write(message).then(
        () => {
          if (!expected) this.#settle(pending, { answer: undefined });
        },
        (error: unknown) => this.#settle(pending, { error }),
      );
    }
    if (expected) this.#takeKept();
  }

  #takeKept(): void {
    const kept = this.#kept;
    this.#kept = new Uint8Array(0);
    if (kept.length > 0) this.#take(kept);
  }

  #write(message: string): Promise<void> {
    const bytes = Buffer.from(`${message}\n`, 'latin1');
    this.#events.onTraffic?.({ direction: 'sent', bytes, monotonicMs: this.#clock.monotonicMs() });
    return this.#link.write(bytes);
  }

  #receive(bytes: Uint8Array): void {
    this.#events.onTraffic?.({ direction: 'received', bytes, monotonicMs: this.#clock.monotonicMs() });
    if (this.#attention !== 'deaf') this.#take(bytes);
  }

  #take(bytes: Uint8Array): void {
    const pending = this.#pending;
    if (pending?.reader) this.#takeAnswer(pending, pending.reader, bytes);
    else this.#takeUnasked(bytes);
  }

  #takeAnswer(pending: Pending, reader: ScpiReader, bytes: Uint8Array): void {
    pending.dueMs = Math.min(this.#clock.monotonicMs() + pending.exchange.timeoutMs, pending.latestMs);
    const news = reader.take(bytes);
    if (news.kind === 'more') return;
    if (news.kind === 'unreadable') {
      const facts = { ...this.#factsOf(pending), firstBytesHex: news.firstBytesHex };
      this.#events.onDoubt(news.because);
      this.#settle(pending, {
        error: new DriverError(news.code, `${this.#nameOf(pending)}: ${news.because}`, facts),
      });
      return;
    }
    this.#takeRest(pending, news.rest);
    const answer: Answer =
      news.kind === 'text' ? { kind: 'text', text: news.text } : { kind: 'block', data: news.data };
    this.#settle(pending, { answer });
  }

  #takeUnasked(bytes: Uint8Array): void {
    if (this.#attention === 'proving') this.#kept = Buffer.concat([this.#kept, bytes]);
    else if (!bytes.every(isSilence)) {
      this.#events.onDoubt(`bytes came that nobody asked for (${hexOf(bytes)})`);
    }
  }

  /** What follows an answer in the same bytes: silence is well; more than that, and which is the answer? */
  #takeRest(pending: Pending, rest: Uint8Array): void {
    if (rest.every(isSilence)) return;
    if (this.#attention === 'proving') {
      this.#kept = Uint8Array.from(rest);
      return;
    }
    const because = `more came than the answer (${hexOf(rest)})`;
    const facts = { ...this.#factsOf(pending), firstBytesHex: hexOf(rest) };
    this.#events.onDoubt(because);
    this.#settle(pending, {
      error: new DriverError('ANALYZER_OUT_OF_STEP', `${this.#nameOf(pending)}: ${because}`, facts),
    });
  }

  #armTimer(pending: Pending): void {
    pending.cancelTimer();
    pending.cancelTimer = this.#clock.at(pending.dueMs, () => {
      if (this.#pending !== pending) return;
      if (this.#clock.monotonicMs() < pending.dueMs) return this.#armTimer(pending);
      this.#timeOut(pending);
    });
  }

  #timeOut(pending: Pending): void {
    const facts = { ...this.#factsOf(pending), timeoutMs: pending.exchange.timeoutMs };
    const because = `${this.#nameOf(pending)} was not answered in time; the answer may still come`;
    this.#events.onDoubt(because);
    const error = pending.reader
      ? new DriverError('ANALYZER_NOT_ANSWERING', because, facts)
      : new DriverError('LINK_TIMEOUT', `${this.#nameOf(pending)} could not be handed to the wire`, facts);
    this.#settle(pending, { error });
  }

  #abort(pending: Pending, reason: unknown): void {
    if (pending.reader) this.#events.onDoubt(`the wait for ${this.#nameOf(pending)} was given up`);
    this.#settle(pending, { error: reason });
  }

  #onClosed(news: LinkClosed): void {
    const pending = this.#pending;
    this.#events.onClosed(news);
    if (pending) {
      const facts = { ...this.#factsOf(pending), by: news.by };
      const message = `${this.#link.name} closed during ${this.#nameOf(pending)}`;
      this.#settle(pending, { error: new DriverError('LINK_CLOSED', message, facts, news.cause) });
    }
  }

  #settle(pending: Pending, outcome: { answer: Answer | undefined } | { error: unknown }): void {
    if (this.#pending !== pending) return;
    this.#pending = undefined;
    pending.cancelTimer();
    pending.release();
    if ('error' in outcome) pending.reject(outcome.error);
    else pending.resolve(outcome.answer);
  }

  #nameOf(pending: Pending): string {
    return pending.exchange.message === undefined ? 'an answer' : `'${excerpt(pending.exchange.message)}'`;
  }

  #factsOf(pending: Pending): { link: string; message: string } {
    return { link: this.#link.name, message: pending.exchange.message ?? '' };
  }
}
