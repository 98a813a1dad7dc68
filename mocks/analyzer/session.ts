// One visitor of the instrument: its bytes come in, its messages are executed one after the other, each
// with at most one line of answers. A message that waits keeps all later ones of the session waiting.
import type { Subscription } from 'rxjs';
import type { Clock } from '../../drivers/clock.ts';
import type { Link } from '../../drivers/link/link.ts';
import type { InstrumentFaults } from './faults.ts';
import type { MessageInput } from './message-input.ts';

export interface SessionParts {
  clock: Clock;
  input: MessageInput;
  lineEnd: string;
  faults: () => InstrumentFaults;
  /** Executes one message; undefined when it has no answer. */
  execute: (message: string) => Promise<Uint8Array | undefined>;
  raise: (number: number) => void;
  onClosed: (session: Session) => void;
}

export class Session {
  readonly #link: Link;
  readonly #parts: SessionParts;
  readonly #subscriptions: Subscription[] = [];
  readonly #messages: string[] = [];
  #unserved: Uint8Array[] | undefined = [];
  #busy = false;

  constructor(link: Link, parts: SessionParts) {
    this.#link = link;
    this.#parts = parts;
    this.#subscriptions.push(
      link.received$.subscribe((bytes) => {
        if (this.#unserved) this.#unserved.push(bytes);
        else this.#take(bytes);
      }),
      link.closed$.subscribe(() => this.#end()),
    );
  }

  /** Begins to serve; what came while the instrument was taken is read now. */
  serve(greeting: string | undefined): void {
    const earlier = this.#unserved ?? [];
    this.#unserved = undefined;
    if (greeting !== undefined) this.#send(latin1(`${greeting}${this.#parts.lineEnd}`));
    for (const bytes of earlier) this.#take(bytes);
  }

  get isServed(): boolean {
    return this.#unserved === undefined;
  }

  /** Cuts the visitor off. */
  async drop(): Promise<void> {
    this.#messages.length = 0;
    await this.#link.close();
  }

  #end(): void {
    for (const subscription of this.#subscriptions) subscription.unsubscribe();
    this.#messages.length = 0;
    if (this.isServed) this.#parts.input.abandonLine();
    this.#parts.onClosed(this);
  }

  #take(bytes: Uint8Array): void {
    for (const event of this.#parts.input.take(bytes)) {
      if (event.kind === 'message') this.#messages.push(event.text);
      else this.#parts.raise(event.kind === 'overrun' ? -363 : -101);
    }
    void this.#work();
  }

  async #work(): Promise<void> {
    if (this.#busy) return;
    this.#busy = true;
    for (let message = this.#messages.shift(); message !== undefined; message = this.#messages.shift()) {
      await this.#handle(message);
    }
    this.#busy = false;
  }

  async #handle(message: string): Promise<void> {
    const faults = this.#parts.faults();
    if (faults.onMessage?.(message) === 'lose') return;
    const answer = await this.#parts.execute(message);
    const delayMs = faults.delayAnswerMs?.(message) ?? 0;
    if (delayMs > 0) await this.#parts.clock.sleep(delayMs);
    if (answer === undefined) return;
    const bytes = faults.onAnswer ? faults.onAnswer(answer, message) : answer;
    if (bytes) this.#send(bytes);
  }

  #send(bytes: Uint8Array): void {
    // A visitor that has gone meanwhile gets nothing; the link tells of its end by itself.
    if (this.#link.isOpen) this.#link.write(bytes).catch(() => {});
  }
}

/** One byte per character. */
export function latin1(text: string): Uint8Array {
  return Uint8Array.from(text, (character) => character.charCodeAt(0) & 0xff);
}
