// Bytes to lines, the simulated controller's own way: a small ring that loses what does not fit without a
// word, and a line in the making that stays when a loss has eaten its end. Real-time bytes never come here.
import { condensed } from './gcode-words.ts';

export interface ReceivedLine {
  /** Without spaces and comments, upper case; the raw text beside it for stored texts. */
  text: string;
  raw: string;
  isTooLong: boolean;
}

export class ReceiveBuffer {
  readonly #capacity: number;
  readonly #lineCharacters: number;
  readonly #joinsCrLf: boolean;
  #waiting: number[] = [];
  #partial = '';
  #afterReturn = false;

  constructor(capacity: number, lineCharacters: number, joinsCrLf: boolean) {
    this.#capacity = capacity;
    this.#lineCharacters = lineCharacters;
    this.#joinsCrLf = joinsCrLf;
  }

  get free(): number {
    return this.#capacity - this.#waiting.length;
  }

  /** A byte from the wire; lost when there is no room. */
  put(byte: number): void {
    if (this.free > 0) this.#waiting.push(byte);
  }

  /** Forgets what waits and the line in the making. */
  clear(): void {
    this.#waiting = [];
    this.#partial = '';
    this.#afterReturn = false;
  }

  /** Forgets the waiting bytes only, as a cancelled jog does in the extended edition. */
  clearWaiting(): void {
    this.#waiting = [];
  }

  /** Takes bytes up to the next line end; undefined when the line is not complete. */
  next(): ReceivedLine | undefined {
    for (let at = 0; at < this.#waiting.length; at += 1) {
      const byte = this.#waiting[at]!;
      const isSecondOfPair = this.#joinsCrLf && byte === 0x0a && this.#afterReturn;
      this.#afterReturn = byte === 0x0d;
      if (isSecondOfPair) continue;
      if (byte !== 0x0a && byte !== 0x0d) {
        this.#partial += String.fromCharCode(byte);
        continue;
      }
      const raw = this.#partial;
      this.#partial = '';
      this.#waiting = this.#waiting.slice(at + 1);
      const text = condensed(raw);
      return { text, raw, isTooLong: text.length > this.#lineCharacters };
    }
    this.#waiting = [];
    return undefined;
  }
}
