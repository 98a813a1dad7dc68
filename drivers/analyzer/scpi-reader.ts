// Bytes of the instrument to one answer, pure and incremental: the pieces may be cut anywhere. A text ends
// with a line feed (a few instruments: with a carriage return); a definite block `#d…` has its length in front and may hold both as
// data, so that the two are never read by the same rule. Knows no time and no link.
//
//   text   silence ─► [ header of the question, blank ] ─► bytes up to LF, or a CR that is the last for now
//   block  silence ─► [ header of the question, blank ] ─► '#' ─► digit d ─► d digits = length ─► that many bytes
//
// The line end behind a block is not waited for (some instruments send none): what is left of it, as of CR LF
// behind a text, is the silence ahead of the next answer.
import { hexOf, isHeaderOf } from './scpi-values.ts';

/**
 * What the question that was asked is answered with; `maxBytes` bounds what the reader will keep. With the
 * `question` its header is taken off the answer, where the instrument prints it.
 */
export interface Expected {
  kind: 'text' | 'block';
  maxBytes: number;
  question?: string;
}

export type ReaderNews =
  | { kind: 'more' }
  | { kind: 'text'; text: string; rest: Uint8Array }
  | { kind: 'block'; data: Uint8Array; rest: Uint8Array }
  | {
      kind: 'unreadable';
      code: 'ANALYZER_BAD_ANSWER' | 'ANALYZER_BAD_BLOCK';
      because: string;
      firstBytesHex: string;
    };

const lineFeed = 0x0a;
const carriageReturn = 0x0d;
const hash = 0x23;
const more: ReaderNews = { kind: 'more' };

/** Bytes that say nothing between two answers: the rest of a line end, blanks, the NUL that pads a block. */
export function isSilence(byte: number): boolean {
  return byte === lineFeed || byte === carriageReturn || byte === 0x20 || byte === 0x09 || byte === 0;
}

function digitOf(byte: number): number | undefined {
  return byte >= 0x30 && byte <= 0x39 ? byte - 0x30 : undefined;
}

/** Where a text ends: at a line feed, or at a carriage return behind which nothing came; −1 for not yet. */
function lineEndIn(piece: Uint8Array): number {
  const feed = piece.indexOf(lineFeed);
  if (feed >= 0) return feed;
  return piece.at(-1) === carriageReturn ? piece.length - 1 : -1;
}

/** A letter, or the colon or asterisk ahead of one. */
function beginsHeader(byte: number): boolean {
  return /^[A-Za-z:*]$/.test(String.fromCharCode(byte));
}

type Stage = 'start' | 'header' | 'text' | 'digits' | 'length' | 'data' | 'done';

const longestHeader = 64;

/** Reads one answer; a new reader is made for each question. */
export class ScpiReader {
  readonly #expected: Expected;
  #stage: Stage = 'start';
  #text = '';
  /** The answer as it came, its first bytes only: evidence when it cannot be read. */
  readonly #first: number[] = [];
  #digitsLeft = 0;
  #length = 0;
  #data = new Uint8Array(0);
  #filled = 0;

  constructor(expected: Expected) {
    this.#expected = expected;
  }

  /** Takes the next piece. After anything but `more` the reader is spent. */
  take(piece: Uint8Array): ReaderNews {
    for (const byte of piece.subarray(0, Math.max(0, 32 - this.#first.length))) this.#first.push(byte);
    let at = 0;
    while (at < piece.length) {
      if (this.#stage === 'data') {
        at += this.#fill(piece.subarray(at));
        if (this.#filled === this.#length) return this.#blockEnds(piece.subarray(at));
        continue;
      }
      if (this.#stage === 'text') return this.#takeText(piece.subarray(at));
      const news = this.#takeByte(piece[at]!, piece, at + 1);
      if (news.kind !== 'more') return news;
      at += 1;
    }
    return more;
  }

  #takeByte(byte: number, piece: Uint8Array, next: number): ReaderNews {
    switch (this.#stage) {
      case 'start':
        return isSilence(byte) ? more : this.#begin(byte);
      case 'header':
        return this.#takeHeader(byte);
      case 'digits':
        return this.#takeDigits(byte);
      case 'length':
        return this.#takeLength(byte, piece, next);
      default:
        return more;
    }
  }

  #begin(byte: number): ReaderNews {
    if (this.#expected.kind === 'text') {
      this.#stage = 'text';
      this.#text = String.fromCharCode(byte);
      return more;
    }
    if (byte !== hash) {
      if (this.#expected.question === undefined || !beginsHeader(byte)) return this.#noBlock();
      this.#stage = 'header';
      this.#text = String.fromCharCode(byte);
      return more;
    }
    this.#stage = 'digits';
    return more;
  }

  #takeHeader(byte: number): ReaderNews {
    if (byte === hash) {
      if (!isHeaderOf(this.#expected.question ?? '', this.#text.trimEnd())) return this.#noBlock();
      this.#stage = 'digits';
      return more;
    }
    const printable = byte >= 0x20 && byte < 0x7f;
    if (!printable || this.#text.length >= longestHeader) return this.#noBlock();
    this.#text += String.fromCharCode(byte);
    return more;
  }

  #noBlock(): ReaderNews {
    return this.#unreadable(
      'a block was asked for and something else came: an old answer, or the trace format was changed',
    );
  }

  /** Latin-1: identities and error texts carry signs beyond ASCII, and no byte may be lost. */
  #takeText(bytes: Uint8Array): ReaderNews {
    const end = lineEndIn(bytes);
    const line = end < 0 ? bytes : bytes.subarray(0, end);
    // A block where a line is expected: its data would be taken for lines.
    if (this.#text === '#' && line[0] !== undefined && digitOf(line[0]) !== undefined) {
      return this.#unreadable('a text was asked for and a block came: the trace format was changed');
    }
    if (this.#text.length + line.length > this.#expected.maxBytes) {
      return this.#unreadable(`the answer is longer than ${this.#expected.maxBytes} bytes`);
    }
    this.#text += Buffer.from(line).toString('latin1');
    if (end < 0) return more;
    this.#stage = 'done';
    return {
      kind: 'text',
      text: this.#withoutHeader(this.#text.replace(/\r+$/, '')),
      rest: bytes.subarray(end + 1),
    };
  }

  #withoutHeader(text: string): string {
    const blank = text.indexOf(' ');
    const { question } = this.#expected;
    if (question === undefined || blank < 0 || !isHeaderOf(question, text.slice(0, blank))) return text;
    return text.slice(blank + 1);
  }

  #takeDigits(byte: number): ReaderNews {
    const digits = digitOf(byte);
    if (digits === 0) {
      return this.#unreadable(
        'the block has no stated length (#0) and its end cannot be seen on a socket; use another trace format',
      );
    }
    if (digits === undefined) return this.#unreadable('no digit follows the # of the block');
    this.#digitsLeft = digits;
    this.#stage = 'length';
    return more;
  }

  #takeLength(byte: number, piece: Uint8Array, next: number): ReaderNews {
    const digit = digitOf(byte);
    if (digit === undefined) return this.#unreadable('the length of the block is no number');
    this.#length = this.#length * 10 + digit;
    this.#digitsLeft -= 1;
    if (this.#digitsLeft > 0) return more;
    if (this.#length > this.#expected.maxBytes) {
      return this.#unreadable(
        `the block announces ${this.#length} bytes, at most ${this.#expected.maxBytes} can be right`,
      );
    }
    this.#data = new Uint8Array(this.#length);
    this.#stage = 'data';
    return this.#length === 0 ? this.#blockEnds(piece.subarray(next)) : more;
  }

  #fill(bytes: Uint8Array): number {
    const taken = bytes.subarray(0, this.#length - this.#filled);
    this.#data.set(taken, this.#filled);
    this.#filled += taken.length;
    return taken.length;
  }

  #blockEnds(rest: Uint8Array): ReaderNews {
    this.#stage = 'done';
    return { kind: 'block', data: this.#data, rest };
  }

  #unreadable(because: string): ReaderNews {
    this.#stage = 'done';
    const code = this.#expected.kind === 'block' ? 'ANALYZER_BAD_BLOCK' : 'ANALYZER_BAD_ANSWER';
    return { kind: 'unreadable', code, because, firstBytesHex: hexOf(Uint8Array.from(this.#first)) };
  }
}
