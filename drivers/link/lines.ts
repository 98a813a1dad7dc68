// Bytes to lines of text, for devices that end a line with LF or CR LF. Knows nothing of what a line means.
// Damage stays visible: a byte that is no printable ASCII becomes U+FFFD, so that no parser above takes a
// damaged line for a whole one; only junk ahead of a line's first character, as wires emit on opening, goes.

/** Stands for every byte that cannot be part of a line, and for the tail of a line beyond the cap. */
export const damageMark = '\uFFFD';

const lineFeed = 0x0a;
const carriageReturn = 0x0d;
const defaultMaxLength = 1024;

export class LineSplitter {
  readonly #maxLength: number;
  #text = '';
  #cut = false;

  /** `maxLength`: characters kept of one line; the rest up to its end is dropped, and the line is marked. */
  constructor(maxLength = defaultMaxLength) {
    this.#maxLength = maxLength;
  }

  /** Takes a piece of any size; returns the lines that it completes, without their ends. Empty lines count. */
  push(bytes: Uint8Array): string[] {
    const lines: string[] = [];
    for (const byte of bytes) {
      if (byte === lineFeed) lines.push(this.#take());
      else if (byte !== carriageReturn) this.#append(byte);
    }
    return lines;
  }

  /** Forgets a line that has begun: after the wire was closed its end will never come. */
  clear(): void {
    this.#text = '';
    this.#cut = false;
  }

  #append(byte: number): void {
    if (this.#cut) return;
    const printable = byte === 0x09 || (byte >= 0x20 && byte < 0x7f);
    if (!printable && this.#text === '') return;
    this.#text += printable ? String.fromCharCode(byte) : damageMark;
    if (this.#text.length <= this.#maxLength) return;
    this.#text = this.#text.slice(0, this.#maxLength) + damageMark;
    this.#cut = true;
  }

  #take(): string {
    const line = this.#text;
    this.clear();
    return line;
  }
}
