// One numbered line, one `ok`, over a link. Line numbers do more than ask for damaged lines again: the counter
// that the controller keeps is forgotten by a restart, so that no line is ever run by a controller that restarted
// unseen. Knows nothing of axes. After an answer that never came both sides first agree anew:
//
//   sent      (empty line)  ?17                                  N1042 G90*..
//   wanted                  echo:Unknown command: "?17"   ok     ok, or Resend: 1041 (the line was lost)
//                                                                Resend: anything else: restarted
import { type Observable, Subject } from 'rxjs';
import type { Clock } from '../clock.ts';
import { isDriverError } from '../errors.ts';
import { LineSplitter } from '../link/lines.ts';
import type { Link, LinkClosed } from '../link/link.ts';
import { ReportExchange, type ReportExchangeParts, type ReportLineOptions } from './report-exchange.ts';
import {
  closedError,
  haltedError,
  pausedError,
  refusedLine,
  restartedError,
  unansweredLine,
} from './report-failures.ts';
import { isTransportComplaint, numberedLine, type ReportLine, readReportLine } from './report-lines.ts';

export type ReportEvent =
  | { kind: 'line'; line: ReportLine; monotonicMs: number }
  | { kind: 'halted'; text: string }
  /** `seen`: told by its boot message; otherwise betrayed by a line counter that is gone. */
  | { kind: 'restart'; seen: boolean }
  | { kind: 'closed'; news: LinkClosed };

export type OnReportTraffic = (direction: 'sent' | 'received', text: string, monotonicMs: number) => void;

const firstNumber = 1000;
const resyncRounds = 4;
/** A controller that is busy says so every 2 s. */
const resyncWithinMs = 2_500;
const maxResends = 3;
/** Lines in a row that may have been lost before both sides agree again. */
const maxMissing = 8;
/** Some releases say `ok` after `Resend:`, others do not. */
const resendPauseMs = 150;

export class ReportSender {
  readonly #link: Link;
  readonly #clock: Clock;
  readonly #onTraffic: OnReportTraffic | undefined;
  readonly #splitter = new LineSplitter();
  readonly #events = new Subject<ReportEvent>();
  #exchange: ReportExchange | undefined;
  #queue: Promise<unknown> = Promise.resolve();
  #outOfStep = true;
  #tokens = 0;
  /** The number of the next line; undefined while the controller's counter is not ours. */
  #next: number | undefined;
  #isCounterProven = false;
  #halted: string | undefined;

  constructor(link: Link, clock: Clock, onTraffic?: OnReportTraffic) {
    this.#link = link;
    this.#clock = clock;
    this.#onTraffic = onTraffic;
    link.received$.subscribe((bytes) => {
      for (const text of this.#splitter.push(bytes)) this.#receive(text);
    });
    link.closed$.subscribe((news) => this.#closed(news));
  }

  get events$(): Observable<ReportEvent> {
    return this.#events;
  }

  /** What a controller said that has halted itself; undefined while it is alive. */
  get halted(): string | undefined {
    return this.#halted;
  }

  /** Another connection may find the controller reset. */
  forgetHalt(): void {
    this.#halted = undefined;
  }

  /**
   * Sends one line when those before it are answered; resolves on `ok` with the lines received meanwhile.
   * Throws POSITIONER_COMMAND_REFUSED, POSITIONER_ALARM (halted), POSITIONER_RESTARTED, POSITIONER_HELD,
   * POSITIONER_STALLED (busy for ever), LINK_CLOSED, POSITIONER_NOT_ANSWERING, or the signal's reason.
   */
  line(text: string, options: ReportLineOptions): Promise<ReportLine[]> {
    return this.#inTurn(async () => {
      options.signal?.throwIfAborted();
      if (this.#outOfStep) await this.#resync(options.signal);
      return this.#askNumbered({ text, ...options });
    });
  }

  /** Makes both sides agree on what is answered. `limitMs`: how long the controller may be busy before. */
  resync(signal?: AbortSignal, limitMs?: number): Promise<void> {
    return this.#inTurn(() => this.#resync(signal, limitMs));
  }

  /** Sends a line in the caller's turn, past everything that waits. Nobody waits for its answer. */
  urgent(text: string): void {
    this.#outOfStep = true;
    this.#note('sent', text);
    // The line end before it: half a line that is left in the controller must not swallow it.
    this.#write(`\n${text}\n`);
  }

  #inTurn<T>(act: () => Promise<T>): Promise<T> {
    const turn = this.#queue.then(act);
    // The caller has the failure; the queue only keeps the order.
    this.#queue = turn.catch(() => {});
    return turn;
  }

  async #resync(signal: AbortSignal | undefined, limitMs?: number): Promise<void> {
    const limits = limitMs === undefined ? {} : { limitMs };
    for (let round = 1; ; round += 1) {
      this.#tokens += 1;
      const token = `?${this.#tokens}`;
      const options = { withinMs: resyncWithinMs, signal, ...limits };
      try {
        await this.#ask({ text: token, token, ...options }, `\n${token}`);
        await this.#agreeOnNumber(options);
        this.#outOfStep = false;
        return;
      } catch (error) {
        if (!isDriverError(error, 'POSITIONER_NOT_ANSWERING') || round >= resyncRounds) throw error;
      }
    }
  }

  async #agreeOnNumber(options: ReportLineOptions): Promise<void> {
    if (this.#next === undefined) {
      await this.#ask({ text: 'M110', ...options }, `M110 N${firstNumber}`);
      this.#next = firstNumber + 1;
      this.#isCounterProven = false;
    }
    await this.#askNumbered({ text: 'G90', mayStepBack: true, ...options });
    this.#isCounterProven = true;
  }

  #askNumbered(parts: ReportExchangeParts): Promise<ReportLine[]> {
    const number = this.#next ?? firstNumber;
    this.#next = number + 1;
    return this.#ask({ ...parts, number }, numberedLine(number, parts.text));
  }

  async #ask(parts: ReportExchangeParts, wire: string): Promise<ReportLine[]> {
    parts.signal?.throwIfAborted();
    if (!this.#link.isOpen) throw closedError(this.#link.name);
    if (this.#halted !== undefined) throw haltedError(this.#halted, this.#link.name);
    const exchange = new ReportExchange(parts, this.#clock, this.#link.name, (failed) => {
      this.#exchange = undefined;
      if (failed) this.#outOfStep = true;
    });
    this.#exchange = exchange;
    parts.onSend?.();
    this.#note('sent', wire.trim());
    this.#write(`${wire}\n`);
    return exchange.outcome;
  }

  #receive(text: string): void {
    this.#note('received', text);
    const line = readReportLine(text);
    if (line.kind === 'start') this.#restarted(true);
    else if (line.kind === 'halted') this.#haltedNow(line.text);
    else this.#take(line);
  }

  #take(line: ReportLine): void {
    this.#events.next({ kind: 'line', line, monotonicMs: this.#clock.monotonicMs() });
    const exchange = this.#exchange;
    if (!exchange) return;
    exchange.lines.push(line);
    if (line.kind === 'busy') {
      if (line.paused) exchange.fail(pausedError(this.#link.name, line.text));
      else exchange.extend();
    } else if (line.kind === 'resend') this.#resend(exchange, line.number);
    else if (line.kind === 'ok') this.#confirmed(exchange);
  }

  #confirmed(exchange: ReportExchange): void {
    const { text, token, needsPosition } = exchange.parts;
    if (exchange.isResending) return;
    if (needsPosition && !exchange.hasPosition) return;
    if (token !== undefined) {
      const echoed = exchange.lines.some((line) => line.kind === 'unknown-command' && line.command === token);
      if (echoed) exchange.finish();
      return;
    }
    const refusal = refusalIn(exchange.lines);
    if (refusal === undefined) exchange.finish();
    else exchange.fail(refusedLine(text, refusal, this.#link.name));
  }

  #resend(exchange: ReportExchange, wanted: number): void {
    // Of a line before, or of what was left of one: the echo alone counts.
    if (exchange.number === undefined) return;
    const missing = exchange.number - wanted;
    const stepsBack = exchange.parts.mayStepBack === true && missing > 0 && missing <= maxMissing;
    if (missing !== 0 && !stepsBack) {
      const isRestart = this.#isCounterProven && wanted < firstNumber;
      if (!this.#isCounterProven) this.#next = undefined;
      if (isRestart) this.#restarted(false);
      else exchange.fail(unansweredLine(exchange.parts.text, 0, this.#link.name));
      return;
    }
    exchange.resends += 1;
    if (exchange.resends > maxResends) {
      exchange.fail(refusedLine(exchange.parts.text, 'damaged on the wire each time', this.#link.name));
      return;
    }
    exchange.number = wanted;
    this.#next = wanted + 1;
    exchange.isResending = true;
    this.#clock.at(this.#clock.monotonicMs() + resendPauseMs, () => {
      if (this.#exchange !== exchange) return;
      exchange.isResending = false;
      const wire = numberedLine(wanted, exchange.parts.text);
      this.#note('sent', wire);
      this.#write(`${wire}\n`);
    });
  }

  #restarted(seen: boolean): void {
    this.#halted = undefined;
    this.#outOfStep = true;
    this.#next = undefined;
    this.#isCounterProven = false;
    this.#events.next({ kind: 'restart', seen });
    const how = seen ? 'it said so' : 'its line counter is gone';
    this.#exchange?.fail(restartedError(this.#link.name, how));
  }

  #haltedNow(text: string): void {
    this.#halted = text;
    this.#outOfStep = true;
    this.#events.next({ kind: 'halted', text });
    this.#exchange?.fail(haltedError(text, this.#link.name));
  }

  #closed(news: LinkClosed): void {
    this.#splitter.clear();
    this.#outOfStep = true;
    this.#exchange?.fail(closedError(this.#link.name, news));
    this.#events.next({ kind: 'closed', news });
  }

  #write(text: string): void {
    // With no exchange open the link's own `closed` event tells.
    this.#link.write(new TextEncoder().encode(text)).catch((error: unknown) => this.#exchange?.fail(error));
  }

  #note(direction: 'sent' | 'received', text: string): void {
    this.#onTraffic?.(direction, text, this.#clock.monotonicMs());
  }
}

/** A refusal is acknowledged like anything else: only what came before the `ok` tells. */
function refusalIn(lines: readonly ReportLine[]): string | undefined {
  for (const line of lines) {
    if (line.kind === 'unknown-command') return `unknown command ${line.command}`;
    if (line.kind === 'complaint' && !isTransportComplaint(line.text)) return line.text;
  }
  return undefined;
}
