// The instrument's error queue and what the numbers mean to its event register.

/** Error texts of SCPI-1999 that this instrument can raise. */
const texts: Readonly<Record<number, string>> = {
  [-101]: 'Invalid character',
  [-102]: 'Syntax error',
  [-103]: 'Invalid separator',
  [-104]: 'Data type error',
  [-108]: 'Parameter not allowed',
  [-109]: 'Missing parameter',
  [-112]: 'Program mnemonic too long',
  [-113]: 'Undefined header',
  [-114]: 'Header suffix out of range',
  [-121]: 'Invalid character in number',
  [-131]: 'Invalid suffix',
  [-138]: 'Suffix not allowed',
  [-151]: 'Invalid string data',
  [-200]: 'Execution error',
  [-211]: 'Trigger ignored',
  [-213]: 'Init ignored',
  [-221]: 'Settings conflict',
  [-222]: 'Data out of range',
  [-224]: 'Illegal parameter value',
  [-230]: 'Data corrupt or stale',
  [-240]: 'Hardware error',
  [-300]: 'Device-specific error',
  [-310]: 'System error',
  [-350]: 'Queue overflow',
  [-363]: 'Input buffer overrun',
};

/** Thrown by a command that is refused; the instrument queues it and answers nothing. */
export class Refusal extends Error {
  override readonly name = 'Refusal';
  readonly number: number;
  /** The device's own remark behind the text. */
  readonly remark: string | undefined;

  constructor(number: number, remark?: string) {
    super(`${number} ${texts[number] ?? ''}`);
    this.number = number;
    this.remark = remark;
  }
}

interface Entry {
  number: number;
  text: string;
}

export class ErrorQueue {
  readonly #entries: Entry[] = [];
  readonly #capacity: number;

  constructor(capacity = 16) {
    this.#capacity = capacity;
  }

  get count(): number {
    return this.#entries.length;
  }

  /** When the queue is full the newest entry gives way to −350; older ones stay. */
  push(number: number, remark?: string): void {
    if (this.#entries.length >= this.#capacity) {
      this.#entries[this.#capacity - 1] = { number: -350, text: texts[-350]! };
      return;
    }
    const text = texts[number] ?? 'Device-specific error';
    this.#entries.push({ number, text: remark === undefined ? text : `${text};${remark}` });
  }

  /** Takes out the oldest entry, as the answer to SYST:ERR?. */
  next(): string {
    const entry = this.#entries.shift();
    if (!entry) return '0,"No error"';
    return `${entry.number},"${entry.text.replaceAll('"', '""')}"`;
  }

  clear(): void {
    this.#entries.length = 0;
  }
}

/** Bit of the standard event register that an error number sets (IEEE 488.2). */
export function eventBitOf(number: number): number {
  if (number <= -100 && number > -200) return 32;
  if (number <= -200 && number > -300) return 16;
  if (number <= -400 && number > -500) return 4;
  if (number === -500) return 128;
  return 8;
}
