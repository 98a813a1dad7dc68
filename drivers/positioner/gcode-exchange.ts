// One line, or a few that belong together, on its way to an answer: what came meanwhile, and its end by answer,
// deadline or signal. Judges nothing; the sender says which line ends it.
import type { Clock } from '../clock.ts';
import { notAnsweringError } from './gcode-failures.ts';
import type { ControllerLine } from './gcode-reports.ts';

export interface LineOptions {
  withinMs: number;
  signal?: AbortSignal | undefined;
  /** Called right before the bytes leave, when both sides are in step. */
  onSend?: () => void;
}

export interface ExchangeParts extends Omit<LineOptions, 'onSend'> {
  text: string;
  /** Answers that close the exchange with `true`; undefined for the plain rule of one answer. */
  done: ((line: ControllerLine) => boolean) | undefined;
  clock: Clock;
  link: string;
  /** Told at once, before whoever waits; `failed`: the answer may still come. */
  onEnd: (failed: boolean) => void;
}

export class GcodeExchange {
  readonly text: string;
  /** Lines that came so far: settings, identity and the like, and the answer. */
  readonly lines: ControllerLine[] = [];
  readonly done: ExchangeParts['done'];
  /** Settles with the lines, or with the reason of a failure. */
  readonly outcome: Promise<ControllerLine[]>;
  readonly #onEnd: ExchangeParts['onEnd'];
  readonly #release: () => void;
  #resolve: (lines: ControllerLine[]) => void = () => {};
  #reject: (why: unknown) => void = () => {};

  constructor({ text, done, withinMs, signal, clock, link, onEnd }: ExchangeParts) {
    this.text = text;
    this.done = done;
    this.#onEnd = onEnd;
    this.outcome = new Promise((resolve, reject) => {
      this.#resolve = resolve;
      this.#reject = reject;
    });
    const onAbort = (): void => this.fail(signal?.reason);
    const cancel = clock.at(clock.monotonicMs() + withinMs, () =>
      this.fail(notAnsweringError(text, withinMs, link)),
    );
    signal?.addEventListener('abort', onAbort, { once: true });
    this.#release = () => {
      cancel();
      signal?.removeEventListener('abort', onAbort);
    };
  }

  finish(): void {
    this.#end(false);
    this.#resolve(this.lines);
  }

  fail(why: unknown): void {
    this.#end(true);
    this.#reject(why);
  }

  #end(failed: boolean): void {
    this.#release();
    this.#onEnd(failed);
  }
}
