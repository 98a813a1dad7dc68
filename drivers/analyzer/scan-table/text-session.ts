// Question and answer in lines of text with an instrument that has no registers to prove step by. One exchange at
// a time; an answer ends at the prompt, or after a known number of lines. What comes unasked, too late or not at
// all costs the session its trust: it is closed, opened anew, and asked the same thing until two answers agree.
import type { Clock } from '../../clock.ts';
import { DriverError } from '../../errors.ts';
import type { Link } from '../../link/link.ts';
import { excerpt } from '../scpi-values.ts';
import type { TrafficNote } from '../scpi-wire.ts';
import { linesOf } from './table-text.ts';

export interface TextSessionOptions {
  prompt: string | undefined;
  lineEnd: string;
  answerTimeoutMs: number;
  onTraffic: ((note: TrafficNote) => void) | undefined;
}

export interface TextQuestion {
  message: string;
  /** Where no prompt ends the answer; 0 for a command. */
  lines: number;
  /** Silence longer than this is no answer. */
  timeoutMs?: number;
  maxChars?: number;
  signal?: AbortSignal | undefined;
}

interface ReopenText {
  /** Lines that leave first. */
  urgent: readonly string[];
  timeoutMs: number;
  signal: AbortSignal | undefined;
}

interface Pending {
  question: TextQuestion;
  text: string;
  finish: (outcome: { lines: string[] } | { error: unknown }) => void;
  extend: () => void;
}

const shortAnswer = 4096;
/** The table of a scan that was given up may still come in front of the first answer. */
const staleTable = 4_000_000;
const pauseBeforeReopeningMs = 200;
const quietMs = 100;
const identityAsksAtMost = 5;

export class TextSession {
  readonly #link: Link;
  readonly #clock: Clock;
  readonly #options: TextSessionOptions;
  #pending: Pending | undefined;
  /** Something came, since it was last looked, that no question explains. */
  #heardUnasked = false;
  #doubt: string | undefined = 'it was never opened';

  constructor(link: Link, clock: Clock, options: TextSessionOptions) {
    this.#link = link;
    this.#clock = clock;
    this.#options = options;
    link.received$.subscribe((bytes) => this.#receive(bytes));
    link.closed$.subscribe(({ by, cause }) => {
      this.distrust(`the link was closed (${by})`);
      const message = `${link.name} was closed (${by})`;
      this.#pending?.finish({ error: new DriverError('LINK_CLOSED', message, { by }, cause) });
    });
  }

  get inStep(): boolean {
    return this.#doubt === undefined;
  }

  get isOpen(): boolean {
    return this.#link.isOpen;
  }

  distrust(because: string): void {
    this.#doubt ??= because;
  }

  #wonder(because: string): void {
    this.#heardUnasked = true;
    this.distrust(because);
  }

  /** Lines of the answer without echo and prompt. Throws ANALYZER_NOT_ANSWERING, ANALYZER_OUT_OF_STEP, LINK_CLOSED … */
  ask(question: TextQuestion): Promise<string[]> {
    if (this.#doubt === undefined) return this.#exchange(question);
    const facts = { because: this.#doubt };
    const code = this.#link.isOpen ? 'ANALYZER_OUT_OF_STEP' : 'LINK_CLOSED';
    return Promise.reject(new DriverError(code, `nothing is asked: ${this.#doubt}`, facts));
  }

  /** A line past everything. Throws LINK_CLOSED. */
  shout(message: string): Promise<void> {
    const bytes = Buffer.from(`${message}${this.#options.lineEnd}`, 'latin1');
    this.#options.onTraffic?.({ direction: 'sent', bytes, monotonicMs: this.#clock.monotonicMs() });
    return this.#link.write(bytes);
  }

  /**
   * Opens anew and asks `question` until two answers in a row agree; returns that answer's lines. `timeoutMs`: an
   * instrument that still scans answers only then.
   */
  async resynchronize(question: string, { urgent, timeoutMs, signal }: ReopenText): Promise<string[]> {
    const wasOpen = this.#link.isOpen;
    await this.close('the session is opened anew');
    if (wasOpen && urgent.length === 0) await this.#clock.sleep(pauseBeforeReopeningMs, signal);
    await this.#link.open(signal);
    await this.shout('');
    for (const message of urgent) await this.shout(message);
    let before: string | undefined;
    for (let asked = 0; asked < identityAsksAtMost; asked += 1) {
      await this.#clock.sleep(quietMs, signal);
      this.#heardUnasked = false;
      const lines = await this.#exchange({
        message: question,
        lines: 1,
        timeoutMs,
        maxChars: staleTable,
        signal,
      });
      const answer = lines.join('\n');
      await this.#clock.sleep(quietMs, signal);
      if (!this.#link.isOpen) throw new DriverError('LINK_CLOSED', `${this.#link.name} was closed`);
      if (answer !== '' && answer === before && !this.#heardUnasked) {
        this.#doubt = undefined;
        return lines;
      }
      before = answer;
    }
    throw new DriverError(
      'ANALYZER_OUT_OF_STEP',
      `'${question}' was asked ${identityAsksAtMost} times and no two answers in a row agree ('${excerpt(before ?? '')}')`,
      { answer: excerpt(before ?? '') },
    );
  }

  async close(because = 'it was closed by us'): Promise<void> {
    this.distrust(because);
    this.#pending?.finish({ error: new DriverError('LINK_CLOSED', `nothing is asked: ${because}`) });
    await this.#link.close();
  }

  #exchange(question: TextQuestion): Promise<string[]> {
    const { message, signal, timeoutMs = this.#options.answerTimeoutMs } = question;
    if (this.#pending) return Promise.reject(new Error('defect: two exchanges at a time on one session'));
    if (signal?.aborted) return Promise.reject(signal.reason);
    return new Promise((resolve, reject) => {
      let cancel = (): void => {};
      const onAbort = (): void => {
        this.distrust(`the wait for '${message}' was given up`);
        finish({ error: signal?.reason });
      };
      const finish: Pending['finish'] = (outcome) => {
        if (this.#pending !== pending) return;
        this.#pending = undefined;
        cancel();
        signal?.removeEventListener('abort', onAbort);
        if ('error' in outcome) reject(outcome.error);
        else resolve(outcome.lines);
      };
      const extend = (): void => {
        cancel();
        cancel = this.#clock.at(this.#clock.monotonicMs() + timeoutMs, () => {
          this.distrust(`'${message}' was not answered in time`);
          const because = `'${excerpt(message)}' was not answered to its end within ${timeoutMs} ms of silence`;
          finish({ error: new DriverError('ANALYZER_NOT_ANSWERING', because, { message, timeoutMs }) });
        });
      };
      const pending: Pending = { question, text: '', finish, extend };
      this.#pending = pending;
      signal?.addEventListener('abort', onAbort, { once: true });
      extend();
      const isSilent = this.#options.prompt === undefined && question.lines === 0;
      this.shout(message).then(
        () => isSilent && finish({ lines: [] }),
        (error: unknown) => {
          this.distrust(`'${message}' could not be sent`);
          finish({ error });
        },
      );
    });
  }

  #receive(bytes: Uint8Array): void {
    this.#options.onTraffic?.({ direction: 'received', bytes, monotonicMs: this.#clock.monotonicMs() });
    const text = Buffer.from(bytes).toString('latin1');
    const pending = this.#pending;
    if (!pending) {
      if (text.trim() !== '') this.#wonder(`text came that nobody asked for ('${excerpt(text.trim())}')`);
      return;
    }
    pending.text += text;
    pending.extend();
    if (pending.text.length > (pending.question.maxChars ?? shortAnswer)) {
      this.distrust('an answer without end');
      const because = `the answer to '${excerpt(pending.question.message)}' is longer than any right one`;
      pending.finish({ error: new DriverError('ANALYZER_BAD_ANSWER', because) });
      return;
    }
    const lines = this.#linesIfComplete(pending);
    if (lines) pending.finish({ lines });
  }

  #linesIfComplete({ text, question }: Pending): string[] | undefined {
    const { prompt } = this.#options;
    const end = Math.max(text.lastIndexOf('\n'), text.lastIndexOf('\r'));
    const rest = text.slice(end + 1);
    // Before the lines are parted: an answer comes in many pieces, and most of them are not its end.
    if (prompt !== undefined && rest.trim() !== prompt.trim()) return undefined;
    const lines = linesOf(text.slice(0, end + 1), question.message);
    if (prompt !== undefined) return lines;
    if (lines.length < question.lines) return undefined;
    if (lines.length > question.lines || rest.trim() !== '') this.#wonder('more came than was asked for');
    return lines.slice(0, question.lines);
  }
}
