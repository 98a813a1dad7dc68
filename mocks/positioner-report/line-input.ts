// Bytes to commands, the simulated position-report controller's own way: a serial buffer that loses what does
// not fit, lines cut off silently, numbers and checksums refused, and the emergency words that a watchful build
// sees in the stream itself, before any queue.
export interface InputEvents {
  /** A command for the queue; empty lines and comments never get here. */
  command: (text: string) => void;
  /** A line was refused; the controller says so and asks for `wanted`. */
  refused: (what: string, last: number, wanted: number) => void;
  emergency: (word: 'M112' | 'M410') => void;
}

export interface InputHabits {
  /** Emergency words act when their last byte arrives, not when the line is taken. */
  watchesStream: boolean;
}

const bufferBytes = 128;
const lineCharacters = 95;
const emergencyWords = ['M112', 'M410'] as const;

export class LineInput {
  readonly #habits: InputHabits;
  readonly #events: InputEvents;
  #waiting: number[] = [];
  #partial = '';
  #arriving = '';
  #last = 0;
  #toSpoil = 0;

  constructor(habits: InputHabits, events: InputEvents) {
    this.#habits = habits;
    this.#events = events;
  }

  /** After a restart nothing is remembered, the line counter least of all. */
  reset(): void {
    this.#waiting = [];
    this.#partial = '';
    this.#arriving = '';
    this.#last = 0;
  }

  /** One character of each of the next lines arrives as another. */
  spoil(lines: number): void {
    this.#toSpoil += lines;
  }

  setLast(number: number): void {
    this.#last = number;
  }

  put(byte: number): void {
    if (this.#habits.watchesStream) this.#watch(byte);
    if (this.#waiting.length < bufferBytes) this.#waiting.push(byte);
  }

  /** Takes lines as long as `hasRoom`. */
  take(hasRoom: () => boolean): void {
    while (hasRoom()) {
      const byte = this.#waiting.shift();
      if (byte === undefined) return;
      if (byte !== 0x0a && byte !== 0x0d) {
        if (this.#partial.length < lineCharacters) this.#partial += String.fromCharCode(byte);
        continue;
      }
      const line = this.#partial;
      this.#partial = '';
      this.#line(line);
    }
  }

  #watch(byte: number): void {
    if (byte !== 0x0a && byte !== 0x0d) {
      this.#arriving += String.fromCharCode(byte);
      return;
    }
    const line = this.#arriving.replace(/^N\d+ ?/, '');
    this.#arriving = '';
    const word = emergencyWords.find((each) => line.startsWith(each));
    if (word) this.#events.emergency(word);
  }

  #line(raw: string): void {
    let text = raw.split(';')[0]!.trim();
    if (text === '') return;
    if (this.#toSpoil > 0) {
      this.#toSpoil -= 1;
      const middle = Math.floor(text.length / 2);
      text = `${text.slice(0, middle)}#${text.slice(middle + 1)}`;
    }
    const numbered = /^N(\d+) ?(.*)$/.exec(text);
    const command = numbered ? this.#checked(text, Number(numbered[1]), numbered[2]!) : text.split('*')[0]!;
    if (command === undefined) return;
    const word = emergencyWords.find((each) => command.startsWith(each));
    if (word && !this.#habits.watchesStream) this.#events.emergency(word);
    this.#events.command(command.trim());
  }

  /** The command of a numbered line, or undefined when it is refused. */
  #checked(text: string, number: number, rest: string): string | undefined {
    const star = rest.lastIndexOf('*');
    const isCounterLine = rest.startsWith('M110');
    if (number !== this.#last + 1 && !isCounterLine)
      return this.#refuse('Line Number is not Last Line Number+1');
    if (star < 0) return this.#refuse('No Checksum with line number');
    const sum = [...text.slice(0, text.lastIndexOf('*'))].reduce((all, c) => all ^ c.charCodeAt(0), 0);
    if (String(sum) !== rest.slice(star + 1).trim()) return this.#refuse('checksum mismatch');
    this.#last = number;
    return rest.slice(0, star);
  }

  #refuse(what: string): undefined {
    // What waits behind a refused line is thrown away.
    this.#waiting = [];
    this.#events.refused(what, this.#last, this.#last + 1);
    return undefined;
  }
}
