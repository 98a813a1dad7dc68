// A wire inside the process: a port that accepts visitors, and links that open against it. Bytes arrive
// in order in a later turn of the clock, in pieces cut as the options say; for nights and unit tests.
import { type Observable, Subject } from 'rxjs';
import type { Clock } from '../clock.ts';
import { DriverError } from '../errors.ts';
import type { Link, LinkClosed, LinkListener } from './link.ts';

export interface MemoryPortOptions {
  /** One-way delay of every piece of bytes. */
  latencyMs?: number;
  /** Cuts what is written into the pieces that arrive; the default delivers it whole. */
  cut?: (bytes: Uint8Array) => Uint8Array[];
}

type Accept = (visitor: Link) => void;

export class MemoryPort {
  readonly #clock: Clock;
  readonly #options: MemoryPortOptions;
  readonly name: string;
  #accept: Accept | undefined;

  constructor(clock: Clock, name = 'memory://port', options: MemoryPortOptions = {}) {
    this.#clock = clock;
    this.name = name;
    this.#options = options;
  }

  /** Starts to accept visitors; the other side of each is handed to `accept`, open. */
  listen(accept: Accept): LinkListener {
    this.#accept = accept;
    const close = async (): Promise<void> => {
      this.#accept = undefined;
    };
    return { name: this.name, close };
  }

  /** A link to this port, not yet open. */
  link(): Link {
    return new MemoryLink(this.name, (near) => {
      if (!this.#accept)
        throw new DriverError('LINK_OPEN_FAILED', `${this.name}: nobody listens`, { link: this.name });
      const far = new MemoryLink(`${this.name}#visitor`, () => {
        throw new DriverError('LINK_OPEN_FAILED', 'a visitor cannot be reopened', { link: this.name });
      });
      const wireOptions = {
        clock: this.#clock,
        latencyMs: this.#options.latencyMs ?? 0,
        cut: this.#options.cut ?? ((b) => [b]),
      };
      far.attach(near, wireOptions);
      near.attach(far, wireOptions);
      this.#accept(far);
    });
  }
}

interface Wire {
  clock: Clock;
  latencyMs: number;
  cut: (bytes: Uint8Array) => Uint8Array[];
}

class MemoryLink implements Link {
  readonly name: string;
  readonly #connect: (near: MemoryLink) => void;
  readonly #received = new Subject<Uint8Array>();
  readonly #closed = new Subject<LinkClosed>();
  #peer: MemoryLink | undefined;
  #wire: Wire | undefined;

  constructor(name: string, connect: (near: MemoryLink) => void) {
    this.name = name;
    this.#connect = connect;
  }

  get isOpen(): boolean {
    return this.#peer !== undefined;
  }

  get received$(): Observable<Uint8Array> {
    return this.#received;
  }

  get closed$(): Observable<LinkClosed> {
    return this.#closed;
  }

  attach(peer: MemoryLink, wire: Wire): void {
    this.#peer = peer;
    this.#wire = wire;
  }

  async open(signal?: AbortSignal): Promise<void> {
    signal?.throwIfAborted();
    this.#connect(this);
  }

  async write(bytes: Uint8Array): Promise<void> {
    const peer = this.#peer;
    const wire = this.#wire;
    if (!peer || !wire) throw new DriverError('LINK_CLOSED', `${this.name} is not open`, { link: this.name });
    const pieces = wire.cut(Uint8Array.from(bytes));
    wire.clock.at(wire.clock.monotonicMs() + wire.latencyMs, () => {
      for (const piece of pieces) if (peer.#peer === this) peer.#received.next(piece);
    });
  }

  async close(): Promise<void> {
    this.#drop({ by: 'local' });
  }

  #drop(news: LinkClosed): void {
    const peer = this.#peer;
    const wire = this.#wire;
    if (!peer || !wire) return;
    this.#peer = undefined;
    wire.clock.at(wire.clock.monotonicMs() + wire.latencyMs, () => {
      if (peer.#peer === this) peer.#drop({ by: 'remote' });
    });
    this.#closed.next(news);
  }
}
