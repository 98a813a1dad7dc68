// The serial line of the simulated controller: everyone who is connected hears every line, and what anyone
// writes ends up in one stream of bytes, both at the pace of the line. Knows nothing of what the bytes mean.
import type { Clock } from '../../drivers/clock.ts';
import type { Link } from '../../drivers/link/link.ts';

/** 115,200 baud, ten bits to the byte. */
export const usualMsPerByte = 10_000 / 115_200;
/** Bytes that arrive together are handed over in pieces of this size, each when its last byte is in. */
const pieceBytes = 12;

export class SerialSide {
  readonly #clock: Clock;
  readonly #msPerByte: number;
  readonly #receive: (byte: number) => void;
  readonly #visitors = new Set<Link>();
  #inboundFreeMs = 0;
  #outboundFreeMs = 0;

  constructor(clock: Clock, msPerByte: number, receive: (byte: number) => void) {
    this.#clock = clock;
    this.#msPerByte = msPerByte;
    this.#receive = receive;
  }

  get visitors(): number {
    return this.#visitors.size;
  }

  connect(visitor: Link): void {
    this.#visitors.add(visitor);
    const listening = visitor.received$.subscribe((bytes) => this.#arrive(bytes));
    const leaving = visitor.closed$.subscribe(() => {
      this.#visitors.delete(visitor);
      listening.unsubscribe();
      leaving.unsubscribe();
    });
  }

  /** Sends a line to everyone, behind what is still on the wire. */
  send(text: string): void {
    const bytes = Buffer.from(`${text}\r\n`, 'latin1');
    const beginMs = Math.max(this.#clock.monotonicMs(), this.#outboundFreeMs);
    this.#outboundFreeMs = beginMs + bytes.length * this.#msPerByte;
    this.#clock.at(this.#outboundFreeMs, () => {
      for (const visitor of this.#visitors) {
        // A visitor who has just left is told nothing: closed$ has taken him off, or is about to.
        visitor.write(bytes).catch(() => this.#visitors.delete(visitor));
      }
    });
  }

  async dropAll(): Promise<void> {
    await Promise.all([...this.#visitors].map((visitor) => visitor.close()));
  }

  #arrive(bytes: Uint8Array): void {
    for (let at = 0; at < bytes.length; at += pieceBytes) {
      const piece = bytes.slice(at, at + pieceBytes);
      const beginMs = Math.max(this.#clock.monotonicMs(), this.#inboundFreeMs);
      this.#inboundFreeMs = beginMs + piece.length * this.#msPerByte;
      this.#clock.at(this.#inboundFreeMs, () => piece.forEach((byte) => void this.#receive(byte)));
    }
  }
}
