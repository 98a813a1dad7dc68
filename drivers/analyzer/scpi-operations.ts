// Whole operations on one instrument, one at a time, and what is done when one fails. The rule: an operation
// leaves the session in step, or says that it could not; after anything doubtful (a reconnection, a failure)
// `doubtful` is set until the setup has been sent and proven again. What the operations do is the analyzer's.
import type { Clock } from '../clock.ts';
import { DriverError, isDriverError } from '../errors.ts';
import type { Link } from '../link/link.ts';
import type { AnalyzerIdentity } from './analyzer.ts';
import { KnownInstrument } from './known-instrument.ts';
import { OperationQueue } from './operation-queue.ts';
import { ScpiConversation, type TraceForm } from './scpi-conversation.ts';
import { withoutQuery } from './scpi-dialects.ts';
import type { SessionOpening } from './scpi-resync.ts';
import { type ReopenOptions, ScpiSession } from './scpi-session.ts';
import { explainSilence, stillOutOfStep, undefinedHeader } from './scpi-status.ts';
import { fillTemplate, type ScpiDialect, type TemplateName } from './scpi-templates.ts';
import type { TrafficNote } from './scpi-wire.ts';

export interface OperationsOptions {
  dialect: ScpiDialect;
  traceForm: TraceForm;
  answerTimeoutMs: number;
  onTraffic: ((note: TrafficNote) => void) | undefined;
}

type Work<T> = (talk: ScpiConversation, stop: AbortSignal) => Promise<T>;

/** What an answer under way still gets when something must not wait: the commands have left already. */
const graceMs = 100;

export class ScpiOperations {
  readonly known = new KnownInstrument();
  /** The instrument may have lost or changed the setup: it is to be sent again before the next sweep. */
  doubtful = true;
  readonly #clock: Clock;
  readonly #traceForm: TraceForm;
  readonly #session: ScpiSession;
  readonly #queue = new OperationQueue();
  /** Without the optional queries that this instrument turned out not to have. */
  #dialect: ScpiDialect;
  /** The last failure of opening: what failed that way is not tried twice in one operation. */
  #openingFailed: unknown;

  constructor(link: Link, clock: Clock, options: OperationsOptions) {
    this.#clock = clock;
    this.#dialect = options.dialect;
    this.#traceForm = options.traceForm;
    const [errorQuery = ''] = this.#messagesOf('errorQuery');
    this.#session = new ScpiSession(link, clock, {
      errorQuery,
      answerTimeoutMs: options.answerTimeoutMs,
      onTraffic: options.onTraffic,
    });
  }

  get inStep(): boolean {
    return this.#session.standing.kind === 'in-step';
  }

  /** Runs `work` in its turn. What it throws has been looked into: the session is in step, or the error says not. */
  run<T>(signal: AbortSignal | undefined, work: Work<T>): Promise<T> {
    return this.#queue.run(async (stop) => {
      for (;;) {
        try {
          return await work(this.#converse(stop, signal), stop);
        } catch (error) {
          const failure = await this.#afterFailure(error, stop);
          if (!this.#learnsFrom(error, failure)) throw failure;
        }
      }
    }, signal);
  }

  /**
   * Past everything: `urgent` commands leave at once, what runs or waits is rejected with `reason`, then `work`
   * is done. If the session does not answer any more it is opened anew, once, and `work` tried again.
   */
  overtake(urgent: readonly TemplateName[], reason: DriverError, work: Work<void>): Promise<void> {
    const names: TemplateName[] = this.#queue.isBusy ? ['abort', ...urgent] : [...urgent];
    // The bytes leave now, whatever is being waited for; whether they worked is asked below. No signal
    // takes part: one that is aborted already must not keep them from it.
    if (this.#session.standing.kind !== 'closed') void this.shout(...names);
    this.#session.hurry(graceMs, reason);
    this.#queue.interrupt(reason);
    return this.#queue.run(async (stop) => {
      const talk = this.#converse(stop, undefined);
      if (this.inStep) {
        try {
          return await work(talk, stop);
        } catch (error) {
          if (!isDriverError(error) || error.code === 'ANALYZER_SETTING_DIFFERS') throw error;
        }
      }
      await this.open(stop, { urgent: names.flatMap((name) => this.#messagesOf(name)) });
      await work(talk, stop);
    });
  }

  async bringInStep(stop: AbortSignal): Promise<void> {
    if (!this.inStep) await this.open(stop);
  }

  /** Opens the session anew, proves step, and compares who answers. */
  async open(stop: AbortSignal, options: Omit<ReopenOptions, 'signal'> = {}): Promise<SessionOpening> {
    this.doubtful = true;
    try {
      const opening = await this.#session.resynchronize({ ...options, signal: stop });
      this.meet(opening.identity, opening.powerOn);
      return opening;
    } catch (error) {
      this.#openingFailed = error;
      throw error;
    }
  }

  /** See KnownInstrument.meet. */
  meet(identity: AnalyzerIdentity, powerOn: boolean): void {
    try {
      this.known.meet(identity, powerOn);
    } catch (error) {
      // It answers in step, and is still not to be spoken to.
      this.#session.distrust('another instrument answers');
      this.#openingFailed = error;
      throw error;
    }
  }

  /** Sends commands past everything. What cannot be sent is found out by those who ask afterwards. */
  async shout(...names: TemplateName[]): Promise<void> {
    try {
      await this.#session.shout(names.flatMap((name) => this.#messagesOf(name)));
    } catch (error) {
      const because = error instanceof Error ? error.message : String(error);
      this.#session.distrust(`a command could not be sent: ${because}`);
    }
  }

  async close(): Promise<void> {
    const reason = new DriverError('ANALYZER_INTERRUPTED', 'the analyzer was closed');
    this.#session.hurry(0, reason);
    this.#queue.interrupt(reason);
    await this.#queue.run(() => this.#session.close());
  }

  #converse(stop: AbortSignal, signal: AbortSignal | undefined): ScpiConversation {
    return new ScpiConversation({
      session: this.#session,
      clock: this.#clock,
      dialect: this.#dialect,
      traceForm: this.#traceForm,
      stop,
      signal,
    });
  }

  /** Brings the session back into step where that can be done at once; returns the error to throw. */
  async #afterFailure(error: unknown, stop: AbortSignal): Promise<unknown> {
    this.doubtful = true;
    if (stop.aborted) return stop.reason;
    if (!(error instanceof DriverError)) return error;
    // A closed link is reported at once; reopening it takes patience, which is the caller's.
    if (this.#session.standing.kind !== 'out-of-step' || error === this.#openingFailed) return error;
    try {
      const opening = await this.open(stop);
      this.known.tellOfPowerCycle(error);
      return explainSilence(error, opening.errors);
    } catch (second) {
      return stop.aborted ? stop.reason : stillOutOfStep(error, second);
    }
  }

  /** True when an optional query was unknown to the instrument: it is not asked again, the operation goes anew. */
  #learnsFrom(error: unknown, failure: unknown): boolean {
    if (!isDriverError(error, 'ANALYZER_NOT_ANSWERING') || !isDriverError(failure)) return false;
    if (failure.facts['scpiCode'] !== undefinedHeader) return false;
    const reduced = withoutQuery(this.#dialect, String(error.facts['message']));
    if (reduced) this.#dialect = reduced;
    return reduced !== undefined;
  }

  #messagesOf(name: TemplateName): string[] {
    const template = this.#dialect.templates[name];
    return template ? fillTemplate(template, { channel: this.#dialect.channel, onOff: 'OFF' }) : [];
  }
}
