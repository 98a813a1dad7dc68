// One line, one answer, over a link; urgent single bytes overtake whatever waits. Everything the controller
// says unasked is an event. Knows nothing of axes. After an answer that never came, or came with an alarm,
// the two sides are out of step: the next line first makes them agree again.
import { type Observable, Subject } from 'rxjs';
import type { Clock } from '../clock.ts';
import { DriverError } from '../errors.ts';
import { LineSplitter } from '../link/lines.ts';
import type { Link, LinkClosed } from '../link/link.ts';
import { AgreementWatch, isParserState } from './gcode-agreement.ts';
import { nextEvent, type SenderEvent, urgentBytes } from './gcode-events.ts';
import { GcodeExchange, type LineOptions } from './gcode-exchange.ts';
import { alarmError, linkClosedError, notAnsweringError, refusedError } from './gcode-failures.ts';
import { type ControllerLine, readLine, type StatusReport } from './gcode-reports.ts';

/** Called for every line and urgent byte, for a log of the wire. */
export type OnTraffic = (direction: 'sent' | 'received', text: string, monotonicMs: number) => void;

const resyncRounds = 3;
const resyncWithinMs = 1_500;
const resyncPauseMs = 250;
/** For a parser state that has been seen before, and may only be late. */
const statePauseMs = 1_000;
const reportTries = 3;
const resetTries = 2;
const reportWithinMs = 1_000;

export class GcodeSender {
  readonly #link: Link;
  readonly #clock: Clock;
  readonly #onTraffic: OnTraffic | undefined;
  readonly #splitter = new LineSplitter();
  readonly #events = new Subject<SenderEvent>();
  #exchange: GcodeExchange | undefined;
  #queue: Promise<unknown> = Promise.resolve();
  #outOfStep = true;
  #resetAsked = false;
  /** It was seen to print its parser state. */
  #printsState = false;

  constructor(link: Link, clock: Clock, onTraffic?: OnTraffic) {
    this.#link = link;
    this.#clock = clock;
    this.#onTraffic = onTraffic;
    link.received$.subscribe((bytes) => {
      for (const text of this.#splitter.push(bytes)) this.#receive(text);
    });
    link.closed$.subscribe((news) => this.#closed(news));
  }

  get events$(): Observable<SenderEvent> {
    return this.#events;
  }

  /**
   * Sends one line when those before it are answered; resolves on `ok` with the lines received meanwhile.
   * Throws POSITIONER_COMMAND_REFUSED, POSITIONER_ALARM, POSITIONER_RESTARTED, LINK_CLOSED,
   * POSITIONER_NOT_ANSWERING after `withinMs`, or the signal's reason.
   */
  line(text: string, options: LineOptions): Promise<ControllerLine[]> {
    const turn = this.#queue.then(async () => {
      options.signal?.throwIfAborted();
      if (this.#outOfStep) await this.#resync(options.signal);
      return this.#ask(text, `${text}\n`, options);
    });
    // The caller has the failure; the queue only keeps the order.
    this.#queue = turn.catch(() => {});
    return turn;
  }

  /** Makes both sides agree on what is answered; returns what the controller said, its parser state included. */
  resync(signal?: AbortSignal): Promise<ControllerLine[]> {
    const turn = this.#queue.then(() => this.#resync(signal));
    this.#queue = turn.catch(() => {});
    return turn;
  }

  /** Sends bytes at once, in the caller's turn. A closed link shows as an event, not here. */
  urgent(...bytes: number[]): void {
    for (const byte of bytes)
      this.#note('sent', byte > 0x20 && byte < 0x7f ? String.fromCharCode(byte) : `0x${byte.toString(16)}`);
    this.#write(Uint8Array.from(bytes));
  }

  /** An empty line whose answer nobody waits for: ends half a line and wakes a sleepy bridge. */
  nudge(text = ''): void {
    this.#outOfStep = true;
    this.#note('sent', text);
    this.#write(new TextEncoder().encode(`${text}\n`));
  }

  /** Asks once for a report; undefined when none came in time. */
  async askReport(
    withinMs = reportWithinMs,
    signal?: AbortSignal,
  ): Promise<{ report: StatusReport; monotonicMs: number } | undefined> {
    signal?.throwIfAborted();
    const answer = this.next((event) => (event.kind === 'report' ? event : undefined), withinMs, signal);
    this.urgent(urgentBytes.report);
    return answer;
  }

  /** A report asked for now. Three questions without an answer: POSITIONER_NOT_ANSWERING. */
  async report(signal?: AbortSignal): Promise<{ report: StatusReport; monotonicMs: number }> {
    this.#checkOpen();
    for (let tried = 0; tried < reportTries; tried += 1) {
      const answer = await this.askReport(reportWithinMs, signal);
      if (answer) return answer;
      this.#checkOpen();
    }
    throw notAnsweringError('?', reportTries * reportWithinMs, this.#link.name);
  }

  /**
   * Soft reset; resolves with the banner. Where it was lost, a report that shows neither hold nor motion must do,
   * and the banner is empty. Throws POSITIONER_NOT_ANSWERING after `withinMs`.
   */
  async reset(withinMs: number, signal?: AbortSignal): Promise<string> {
    // A banner comes within half a second, with an alarm ahead of it within one; half as long for a report.
    const tryMs = withinMs / resetTries / 1.5;
    for (let tried = 0; tried < resetTries; tried += 1) {
      this.#resetAsked = true;
      try {
        const banner = this.next((event) => (event.kind === 'restart' ? event : undefined), tryMs, signal);
        this.urgent(urgentBytes.softReset);
        const seen = await banner;
        if (seen) return seen.banner;
        const { report } = (await this.askReport(tryMs / 2, signal)) ?? {};
        if (report?.state === 'Idle' || report?.state === 'Alarm') {
          this.#restarted('');
          return '';
        }
      } finally {
        this.#resetAsked = false;
      }
    }
    throw notAnsweringError('soft reset', withinMs, this.#link.name);
  }

  /** See nextEvent; LINK_CLOSED when the link closes meanwhile. */
  next<T>(
    pick: (event: SenderEvent) => T | undefined,
    withinMs: number,
    signal?: AbortSignal,
  ): Promise<T | undefined> {
    return nextEvent(this.#events, this.#clock, {
      pick: (event) => pick(event) ?? this.#throwIfClosed(event),
      withinMs,
      signal,
    });
  }

  /** See AgreementWatch for what is said and how its answers are told from older ones. */
  async #resync(signal: AbortSignal | undefined): Promise<ControllerLine[]> {
    for (let round = 0; ; round += 1) {
      const watch = new AgreementWatch(round);
      let cancelQuiet = (): void => {};
      const done = (line: ControllerLine): boolean => {
        cancelQuiet();
        const verdict = watch.take(line);
        if (verdict === 'perhaps') {
          const quietMs = this.#printsState ? statePauseMs : resyncPauseMs;
          cancelQuiet = this.#clock.at(this.#clock.monotonicMs() + quietMs, () => this.#exchange?.finish());
        }
        return verdict === 'agreed';
      };
      try {
        const lines = await this.#ask('resync', watch.wire, { withinMs: resyncWithinMs, signal }, done);
        this.#outOfStep = false;
        return lines;
      } catch (error) {
        const retry = error instanceof DriverError && error.code === 'POSITIONER_NOT_ANSWERING';
        if (!retry || round + 1 >= resyncRounds) throw error;
      } finally {
        cancelQuiet();
      }
    }
  }

  async #ask(
    text: string,
    wire: string,
    { withinMs, signal, onSend }: LineOptions,
    done?: (line: ControllerLine) => boolean,
  ): Promise<ControllerLine[]> {
    signal?.throwIfAborted();
    this.#checkOpen();
    const onEnd = (failed: boolean): void => {
      this.#exchange = undefined;
      if (failed) this.#outOfStep = true;
    };
    const parts = { text, done, withinMs, signal, clock: this.#clock, link: this.#link.name, onEnd };
    const exchange = new GcodeExchange(parts);
    this.#exchange = exchange;
    onSend?.();
    this.#note('sent', wire.trimEnd());
    this.#write(new TextEncoder().encode(wire));
    return exchange.outcome;
  }

  #receive(text: string): void {
    this.#note('received', text);
    const line = readLine(text);
    if (line.kind === 'report') {
      this.#events.next({ ...line, monotonicMs: this.#clock.monotonicMs() });
    } else if (line.kind === 'banner') {
      this.#restarted(line.text);
    } else if (line.kind === 'alarm') {
      this.#alarmed(line.number);
    } else {
      this.#answered(line);
    }
  }

  #answered(line: ControllerLine): void {
    if (isParserState(line)) this.#printsState = true;
    const exchange = this.#exchange;
    if (!exchange) {
      this.#events.next({ kind: 'stray', line });
      return;
    }
    exchange.lines.push(line);
    if (exchange.done) {
      if (exchange.done(line)) this.#exchange?.finish();
    } else if (line.kind === 'ok') {
      this.#exchange?.finish();
    } else if (line.kind === 'error') {
      // Some firmwares go on refusing until they are asked something else: being out of step sees to that.
      exchange.fail(refusedError(line.number, exchange.text, this.#link.name));
    }
  }

  #alarmed(number: number): void {
    this.#outOfStep = true;
    this.#events.next({ kind: 'alarm', number });
    // The `ok` that may still follow is none: the exchange ends here.
    this.#exchange?.fail(alarmError(number, this.#link.name));
  }

  #restarted(banner: string): void {
    const asked = this.#resetAsked;
    this.#resetAsked = false;
    this.#outOfStep = true;
    this.#events.next({ kind: 'restart', banner, asked });
    this.#exchange?.fail(
      new DriverError('POSITIONER_RESTARTED', `${this.#link.name} restarted`, {
        line: this.#exchange.text,
        banner,
      }),
    );
  }

  #closed(news: LinkClosed): void {
    this.#splitter.clear();
    this.#outOfStep = true;
    this.#exchange?.fail(linkClosedError(this.#link.name, news));
    this.#events.next({ kind: 'closed', news });
  }

  #write(bytes: Uint8Array): void {
    // With no exchange open the link's own `closed` event tells, or the report that does not come.
    this.#link.write(bytes).catch((error: unknown) => this.#exchange?.fail(error));
  }

  #checkOpen(): void {
    if (!this.#link.isOpen) throw linkClosedError(this.#link.name);
  }

  #throwIfClosed(event: SenderEvent): undefined {
    if (event.kind === 'closed') throw linkClosedError(this.#link.name, event.news);
    return undefined;
  }

  #note(direction: 'sent' | 'received', text: string): void {
    this.#onTraffic?.(direction, text, this.#clock.monotonicMs());
  }
}
