// What one operation says to the instrument: templates of the dialect filled in, answers decoded, errors
// fetched. An answer that does not have the form asked for also costs the session its trust: it may be
// the answer to an older question.
import type { Clock } from '../clock.ts';
import { DriverError } from '../errors.ts';
import { drainErrorQueue } from './scpi-resync.ts';
import type { AskOptions, ScpiSession } from './scpi-session.ts';
import { errorOf } from './scpi-status.ts';
import { fillTemplate, type ScpiDialect, type Substitutions, type TemplateName } from './scpi-templates.ts';
import {
  decodeBlock,
  decodeBoolean,
  decodeContinuous,
  decodeNumberList,
  decodeSetting,
  decodeStated,
  decodeWord,
  excerpt,
  hexOf,
  type ScpiErrorEntry,
} from './scpi-values.ts';

/** How traces and axes travel: agreed with the instrument, and needed to read them. */
export interface TraceForm {
  format: 'real64' | 'real32' | 'ascii';
  byteOrder: 'normal' | 'swapped';
}

export interface ConversationParts {
  session: ScpiSession;
  clock: Clock;
  dialect: ScpiDialect;
  traceForm: TraceForm;
  /** Ends the operation between two exchanges and during waits. */
  stop: AbortSignal;
  /** The caller's own signal: ends also the exchange under way. */
  signal: AbortSignal | undefined;
}

/** Longest form of a number in a list: sign, 17 digits, point, exponent, comma, blank. */
const asciiBytesPerNumber = 32;
/** Beyond the largest right size, so that a changed point count is reported as such. */
const blockSlack = 2;

export class ScpiConversation {
  readonly dialect: ScpiDialect;
  readonly clock: Clock;
  readonly traceForm: TraceForm;
  readonly #session: ScpiSession;
  readonly #stop: AbortSignal;
  readonly #signal: AbortSignal | undefined;

  constructor(parts: ConversationParts) {
    this.dialect = parts.dialect;
    this.clock = parts.clock;
    this.traceForm = parts.traceForm;
    this.#session = parts.session;
    this.#stop = parts.stop;
    this.#signal = parts.signal;
  }

  has(name: TemplateName): boolean {
    return this.dialect.templates[name] !== undefined;
  }

  sleep(ms: number): Promise<void> {
    return this.clock.sleep(ms, this.#stop);
  }

  /** Sends a command of the dialect; one that the dialect does not have is left out. */
  async tell(name: TemplateName, values: Substitutions = {}): Promise<void> {
    for (const message of this.#messages(name, values)) await this.tellPlain(message);
  }

  /** A command that all instruments share. */
  async tellPlain(message: string): Promise<void> {
    this.#stop.throwIfAborted();
    await this.#session.tell(message, { signal: this.#signal });
  }

  askNumber(name: TemplateName, values: Substitutions = {}): Promise<number> {
    return this.#askDecoded(this.#message(name, values), decodeSetting);
  }

  /** A number that the instrument may have none for: undefined then. */
  askStated(name: TemplateName): Promise<number | undefined> {
    return this.#askDecoded(this.#message(name, {}), decodeStated);
  }

  askBoolean(name: TemplateName, values: Substitutions = {}): Promise<boolean> {
    return this.#askDecoded(this.#message(name, values), decodeBoolean);
  }

  /** Whether it sweeps on and on, asked by `continuousQuery`. */
  askContinuous(): Promise<boolean> {
    return this.#askDecoded(this.#message('continuousQuery', {}), decodeContinuous);
  }

  askWord(name: TemplateName, values: Substitutions = {}): Promise<string> {
    return this.#askDecoded(this.#message(name, values), decodeWord);
  }

  /** A query that all instruments share, decoded by `decode`. */
  askPlain<T>(message: string, decode: (text: string) => T, options: AskOptions = {}): Promise<T> {
    return this.#askDecoded(message, decode, options);
  }

  /** `*ESR?`: reading clears it, so that what is read must be kept. */
  readEvents(timeoutMs?: number): Promise<number> {
    return this.#askDecoded('*ESR?', decodeSetting, timeoutMs === undefined ? {} : { timeoutMs });
  }

  /** `count` numbers in the agreed form. Throws ANALYZER_BAD_BLOCK or ANALYZER_BAD_ANSWER for another count. */
  async askNumbers(name: TemplateName, count: number, values: Substitutions = {}): Promise<Float64Array> {
    const message = this.#message(name, values);
    const numbers = await this.#askNumbers(message, count);
    if (numbers.length === count) return numbers;
    throw new DriverError(
      this.traceForm.format === 'ascii' ? 'ANALYZER_BAD_ANSWER' : 'ANALYZER_BAD_BLOCK',
      `'${message}' gave ${numbers.length} numbers instead of ${count}: points or format were changed`,
      { message, expected: count, got: numbers.length },
    );
  }

  async #askNumbers(message: string, count: number): Promise<Float64Array> {
    this.#stop.throwIfAborted();
    const { format, byteOrder } = this.traceForm;
    if (format === 'ascii') {
      const maxBytes = 256 + count * asciiBytesPerNumber * blockSlack;
      return this.#askDecoded(message, decodeNumberList, {}, maxBytes);
    }
    const maxBytes = 256 + count * 8 * blockSlack;
    const data = await this.#session.askBlock(message, maxBytes, { signal: this.#signal });
    return decodeBlock(data, format === 'real64' ? 8 : 4, byteOrder);
  }

  /** Empties the error queue. */
  drain(): Promise<ScpiErrorEntry[]> {
    return drainErrorQueue(async () => {
      this.#stop.throwIfAborted();
      return this.#session.askText(this.#message('errorQuery', {}), { signal: this.#signal });
    });
  }

  /** Empties the error queue and throws what it held, as done `during`; see errorOf. */
  async throwErrors(during: string): Promise<void> {
    const error = errorOf(await this.drain(), during);
    if (!error) return;
    if (error.code === 'ANALYZER_OUT_OF_STEP') this.#session.distrust(error.message);
    throw error;
  }

  async #askDecoded<T>(
    message: string,
    decode: (text: string) => T,
    options: AskOptions = {},
    maxBytes?: number,
  ): Promise<T> {
    this.#stop.throwIfAborted();
    const text = await this.#session.askText(message, {
      ...options,
      signal: this.#signal,
      ...(maxBytes !== undefined && { maxBytes }),
    });
    try {
      return decode(text);
    } catch (cause) {
      const because = `'${message}' was answered with '${excerpt(text)}'`;
      this.#session.distrust(because);
      const firstBytesHex = hexOf(Buffer.from(text.slice(0, 64), 'latin1'));
      throw new DriverError('ANALYZER_BAD_ANSWER', because, { message, firstBytesHex }, cause);
    }
  }

  #message(name: TemplateName, values: Substitutions): string {
    const [message] = this.#messages(name, values);
    if (message !== undefined) return message;
    throw new DriverError('ANALYZER_BAD_DIALECT', `the dialect ${this.dialect.name} has no '${name}'`, {
      template: name,
    });
  }

  #messages(name: TemplateName, values: Substitutions): string[] {
    const template = this.dialect.templates[name];
    if (template === undefined) return [];
    return fillTemplate(template, { channel: this.dialect.channel, ...values });
  }
}
