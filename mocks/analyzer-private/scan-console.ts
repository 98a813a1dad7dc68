// A low-cost network analyzer with a command tree of its own behind a text console: it greets, echoes every line,
// answers in lines and prints a prompt. No SCPI, no registers, no error queue. One visitor at a time is listened to.
import type { Clock } from '../../drivers/clock.ts';
import type { Link } from '../../drivers/link/link.ts';
import type { Measure } from '../analyzer/measurement.ts';
import { executeLine } from './console-commands.ts';
import { ConsoleState } from './console-state.ts';

export const consolePrompt = 'ok> ';

export interface ScanConsoleOptions {
  clock: Clock;
  measure: Measure;
  version?: string;
}

export interface ConsoleFaults {
  /** Changes what is printed after a line, or prints nothing at all (undefined), also no prompt. */
  onPrint?: (text: string, line: string) => string | undefined | Promise<string | undefined>;
}

export class ScanConsole {
  /** May be changed at any moment. */
  faults: ConsoleFaults = {};
  readonly state: ConsoleState;
  readonly #visitors: Link[] = [];
  readonly #lines: string[] = [];
  #typed = '';
  #isBusy = false;

  constructor({ clock, measure, version = 'BENCH-SCAN 1.3 board 0007' }: ScanConsoleOptions) {
    this.state = new ConsoleState(clock, measure, version);
  }

  get isScanning(): boolean {
    return this.#isBusy;
  }

  /** Takes in a visitor whose link is open. */
  accept(visitor: Link): void {
    this.#visitors.push(visitor);
    const hearing = visitor.received$.subscribe((bytes) => {
      if (visitor === this.#visitors[0]) this.#hear(bytes);
    });
    const leaving = visitor.closed$.subscribe(() => {
      hearing.unsubscribe();
      leaving.unsubscribe();
      this.#forget(visitor);
    });
    if (visitor === this.#visitors[0]) this.#greet();
  }

  /** Power goes and comes: what was set is forgotten, visitors are cut off. */
  async powerCycle(): Promise<void> {
    this.state.reset();
    this.#typed = '';
    this.#lines.length = 0;
    await Promise.all([...this.#visitors].map((visitor) => visitor.close()));
  }

  #forget(visitor: Link): void {
    const wasFirst = visitor === this.#visitors[0];
    this.#visitors.splice(this.#visitors.indexOf(visitor), 1);
    // What was typed stays in the line: the console does not know of visitors.
    if (wasFirst && this.#visitors.length > 0) this.#greet();
  }

  #greet(): void {
    this.#print(`\r\nscan console, type help\r\n${consolePrompt}`);
  }

  #hear(bytes: Uint8Array): void {
    for (const byte of bytes) {
      const sign = String.fromCharCode(byte);
      if (sign === '\r') {
        this.#lines.push(this.#typed);
        this.#typed = '';
      } else if (sign !== '\n') this.#typed += sign;
    }
    void this.#work();
  }

  async #work(): Promise<void> {
    if (this.#isBusy) return;
    this.#isBusy = true;
    for (let line = this.#lines.shift(); line !== undefined; line = this.#lines.shift()) {
      const answer = await executeLine(this.state, line);
      const text = [line, ...answer].map((each) => `${each}\r\n`).join('') + consolePrompt;
      const printed = this.faults.onPrint ? await this.faults.onPrint(text, line) : text;
      if (printed !== undefined) this.#print(printed);
    }
    this.#isBusy = false;
  }

  #print(text: string): void {
    const visitor = this.#visitors[0];
    // A visitor that has gone meanwhile gets nothing; the link tells of its end by itself.
    if (visitor?.isOpen) visitor.write(Uint8Array.from(text, (sign) => sign.charCodeAt(0))).catch(() => {});
  }
}
