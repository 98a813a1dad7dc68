// Question and answer with an instrument that never says which answer is to which question. One question
// at a time; the session knows whether answers still pair with questions ("in step") and refuses to ask
// when they may not: a late answer would be taken for the next one, and so on for ever. Opening anew and
// proving step is scpi-resync.ts; what is asked, and why, is the analyzer's part.
import type { Clock } from '../clock.ts';
import { DriverError } from '../errors.ts';
import type { Link } from '../link/link.ts';
import type { Expected } from './scpi-reader.ts';
import { proveStep, type SessionOpening } from './scpi-resync.ts';
import { checkMessage } from './scpi-templates.ts';
import { type Answer, type Exchange, ScpiWire, type TrafficNote } from './scpi-wire.ts';

export type Standing =
  | { kind: 'in-step' }
  /** `closed`: no link; `out-of-step`: a link whose next answer may belong to an older question. */
  | { kind: 'closed' | 'out-of-step'; because: string };

export interface SessionOptions {
  errorQuery: string;
  /** Silence longer than this is no answer. */
  answerTimeoutMs: number;
  onTraffic?: ((note: TrafficNote) => void) | undefined;
}

export interface ReopenOptions {
  signal?: AbortSignal | undefined;
  /** Commands that leave first. */
  urgent?: readonly string[];
  /** How long a new connection may stay silent; at least one answer is waited for. */
  patienceMs?: number;
}

export interface AskOptions {
  signal?: AbortSignal | undefined;
  timeoutMs?: number;
}

/** Longest line that is no trace: identities and error texts stay far below. */
const lineMaxBytes = 4096;
/** Instruments with one session need a moment to notice that the last one has ended. */
const pauseBeforeReopeningMs = 200;

interface Waiting {
  exchange: Exchange;
  resolve: (answer: Answer | undefined) => void;
  reject: (error: unknown) => void;
  /** Takes the listener off the signal, which may live for a whole night. */
  release: () => void;
}

export class ScpiSession {
  readonly #wire: ScpiWire;
  readonly #clock: Clock;
  readonly #options: SessionOptions;
  readonly #waiting: Waiting[] = [];
  #busy = false;
  #proving = false;
  #standing: Standing = { kind: 'closed', because: 'it was never opened' };

  constructor(link: Link, clock: Clock, options: SessionOptions) {
    this.#clock = clock;
    this.#options = options;
    this.#wire = new ScpiWire(link, clock, {
      onTraffic: options.onTraffic,
      onDoubt: (because) => this.distrust(because),
      onClosed: (news) => {
        this.#standing = { kind: 'closed', because: `the link was closed (${news.by})` };
      },
    });
  }

  get standing(): Standing {
    return this.#standing;
  }

  /** One line. Throws what ScpiWire.exchange throws; ANALYZER_OUT_OF_STEP or LINK_CLOSED without asking. */
  async askText(message: string, options: AskOptions & { maxBytes?: number } = {}): Promise<string> {
    const answer = await this.#ask(
      message,
      { kind: 'text', maxBytes: options.maxBytes ?? lineMaxBytes },
      options,
    );
    return answer?.kind === 'text' ? answer.text : '';
  }

  /** The data of one definite block of at most `maxBytes`. Throws like `askText`. */
  async askBlock(message: string, maxBytes: number, options: AskOptions = {}): Promise<Uint8Array> {
    const answer = await this.#ask(message, { kind: 'block', maxBytes }, options);
    return answer?.kind === 'block' ? answer.data : new Uint8Array(0);
  }

  /** A command; resolves when its bytes were handed over, for nothing is ever answered. */
  async tell(message: string, options: AskOptions = {}): Promise<void> {
    await this.#ask(message, undefined, options);
  }

  /** Commands past everything, at once, also while an answer is awaited. Throws LINK_CLOSED. */
  async shout(messages: readonly string[]): Promise<void> {
    for (const message of messages) checkMessage(message);
    await Promise.all(messages.map((message) => this.#wire.shout(message)));
  }

  /** The answer under way gets `ms` more; what waits behind it is rejected with `reason`. */
  hurry(ms: number, reason: unknown): void {
    this.#rejectWaiting(reason);
    this.#wire.hurry(ms);
  }

  /** From now on nothing is asked until `resynchronize` has run. */
  distrust(because: string): void {
    if (this.#standing.kind === 'in-step') this.#standing = { kind: 'out-of-step', because };
  }

  /**
   * Closes, opens anew and proves that answers pair with questions.
   * Throws LINK_OPEN_FAILED, LINK_CLOSED, ANALYZER_NOT_ANSWERING, ANALYZER_OUT_OF_STEP,
   * ANALYZER_BAD_ANSWER or the signal's reason; the session is then still not in step.
   */
  async resynchronize(options: ReopenOptions = {}): Promise<SessionOpening> {
    const { signal, urgent = [], patienceMs = 0 } = options;
    if (this.#proving) throw new Error('defect: a session is resynchronized twice at a time');
    this.#proving = true;
    try {
      const wasOpen = this.#wire.isOpen;
      await this.close('the session is opened anew');
      if (wasOpen && urgent.length === 0) await this.#clock.sleep(pauseBeforeReopeningMs, signal);
      await this.#wire.open(signal);
      this.#standing = { kind: 'out-of-step', because: 'step is not proven yet' };
      const opening = await proveStep(this.#wire, this.#clock, {
        errorQuery: this.#options.errorQuery,
        answerTimeoutMs: this.#options.answerTimeoutMs,
        patienceMs,
        urgent,
        signal,
      });
      if (this.#wire.isOpen) this.#standing = { kind: 'in-step' };
      return opening;
    } finally {
      this.#proving = false;
    }
  }

  async close(because = 'it was closed by us'): Promise<void> {
    const error = this.#refusal({ kind: 'out-of-step', because });
    this.#rejectWaiting(error);
    await this.#wire.close();
    this.#wire.abandon(error);
    this.#standing = { kind: 'closed', because };
  }

  #ask(message: string, expected: Expected | undefined, options: AskOptions): Promise<Answer | undefined> {
    checkMessage(message);
    if (expected ? !message.includes('?') : message.includes('?')) {
      throw new DriverError(
        'ANALYZER_BAD_DIALECT',
        `'${message}' is used as ${expected ? 'a query' : 'a command'}`,
      );
    }
    const timeoutMs = options.timeoutMs ?? this.#options.answerTimeoutMs;
    const exchange: Exchange = { message, timeoutMs, signal: options.signal, ...(expected && { expected }) };
    return new Promise((resolve, reject) => {
      const onAbort = (): void => this.#withdraw(waiting);
      const release = (): void => options.signal?.removeEventListener('abort', onAbort);
      const waiting: Waiting = { exchange, resolve, reject, release };
      options.signal?.addEventListener('abort', onAbort, { once: true });
      this.#waiting.push(waiting);
      this.#pump();
    });
  }

  #rejectWaiting(reason: unknown): void {
    for (const waiting of this.#waiting.splice(0)) {
      waiting.release();
      waiting.reject(reason);
    }
  }

  #withdraw(waiting: Waiting): void {
    const at = this.#waiting.indexOf(waiting);
    if (at < 0) return;
    this.#waiting.splice(at, 1);
    waiting.reject(waiting.exchange.signal?.reason);
  }

  #pump(): void {
    if (this.#busy) return;
    const next = this.#waiting.shift();
    if (!next) return;
    next.release();
    this.#busy = true;
    this.#run(next).finally(() => {
      this.#busy = false;
      this.#pump();
    });
  }

  async #run({ exchange, resolve, reject }: Waiting): Promise<void> {
    try {
      exchange.signal?.throwIfAborted();
      if (this.#standing.kind !== 'in-step' || this.#proving) throw this.#refusal(this.#standing);
      resolve(await this.#wire.exchange(exchange));
    } catch (error) {
      reject(error);
    }
  }

  #refusal(standing: Standing): DriverError {
    const because = standing.kind === 'in-step' ? 'the session is being opened anew' : standing.because;
    return standing.kind === 'closed'
      ? new DriverError('LINK_CLOSED', `nothing is asked: ${because}`, { because })
      : new DriverError('ANALYZER_OUT_OF_STEP', `nothing is asked, answers may not pair: ${because}`, {
          because,
        });
  }
}
