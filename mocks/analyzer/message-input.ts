// From bytes to messages on the instrument's side: a message ends at CR or LF, whatever pieces it came in,
// and must fit the input buffer.

export type InputEvent = { kind: 'message'; text: string } | { kind: 'overrun' } | { kind: 'remains' };

const carriageReturn = 13;
const lineFeed = 10;

export class MessageInput {
  readonly #capacity: number;
  #pending = '';
  #remains = false;

  constructor(capacity = 4096) {
    this.#capacity = capacity;
  }

  /** The visitor has gone in mid-line: what it left spoils the start of the next message. */
  abandonLine(): void {
    if (this.#pending !== '') this.#remains = true;
    this.#pending = '';
  }

  clear(): void {
    this.#pending = '';
    this.#remains = false;
  }

  /** Messages that these bytes complete, in order; empty ones are left out. */
  take(bytes: Uint8Array): InputEvent[] {
    const events: InputEvent[] = [];
    for (const byte of bytes) {
      if (byte === carriageReturn || byte === lineFeed) {
        if (this.#remains) events.push({ kind: 'remains' });
        this.#remains = false;
        if (this.#pending !== '') events.push({ kind: 'message', text: this.#pending });
        this.#pending = '';
        continue;
      }
      this.#pending += String.fromCharCode(byte);
      if (this.#pending.length >= this.#capacity) {
        // The buffer is thrown away; the tail of the line then stands as a message of its own.
        events.push({ kind: 'overrun' });
        this.#pending = '';
      }
    }
    return events;
  }
}
