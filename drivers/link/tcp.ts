// A TCP wire over node:net. No delay for small writes, keep-alive against cables pulled out; a half-open
// peer is still only found by the deadlines of the driver above.
import { connect, createServer, type Server, type Socket } from 'node:net';
import { type Observable, Subject } from 'rxjs';
import type { Clock } from '../clock.ts';
import { DriverError } from '../errors.ts';
import type { Link, LinkClosed, LinkListener } from './link.ts';

const keepAliveIdleMs = 10_000;
const connectTimeoutMs = 5_000;

export class TcpLink implements Link {
  readonly name: string;
  readonly #dial: ((signal?: AbortSignal) => Promise<Socket>) | undefined;
  readonly #received = new Subject<Uint8Array>();
  readonly #closed = new Subject<LinkClosed>();
  #socket: Socket | undefined;
  #closing = false;

  /** A link that dials `host:port` when opened; the clock bounds the time a connection may take. */
  static to(host: string, port: number, clock: Clock): TcpLink {
    const name = `tcp://${host.includes(':') ? `[${host}]` : host}:${port}`;
    return new TcpLink(name, (signal) => dial(name, host, port, clock, signal));
  }

  private constructor(name: string, dialer?: (signal?: AbortSignal) => Promise<Socket>, socket?: Socket) {
    this.name = name;
    this.#dial = dialer;
    if (socket) this.#adopt(socket);
  }

  /** The accepting side: a link over a socket that is already connected. */
  static over(socket: Socket): TcpLink {
    return new TcpLink(`tcp://${socket.remoteAddress ?? '?'}:${socket.remotePort ?? 0}`, undefined, socket);
  }

  get isOpen(): boolean {
    return this.#socket !== undefined;
  }

  get received$(): Observable<Uint8Array> {
    return this.#received;
  }

  get closed$(): Observable<LinkClosed> {
    return this.#closed;
  }

  async open(signal?: AbortSignal): Promise<void> {
    if (!this.#dial)
      throw new DriverError('LINK_OPEN_FAILED', `${this.name}: an accepted link cannot be reopened`);
    this.#adopt(await this.#dial(signal));
  }

  write(bytes: Uint8Array): Promise<void> {
    const socket = this.#socket;
    if (!socket) {
      return Promise.reject(new DriverError('LINK_CLOSED', `${this.name} is not open`, { link: this.name }));
    }
    return new Promise((resolve, reject) => {
      socket.write(bytes, (error) => {
        if (error)
          reject(
            new DriverError('LINK_CLOSED', `${this.name}: ${error.message}`, { link: this.name }, error),
          );
        else resolve();
      });
    });
  }

  close(): Promise<void> {
    const socket = this.#socket;
    if (!socket) return Promise.resolve();
    this.#closing = true;
    return new Promise((resolve) => {
      socket.once('close', () => resolve());
      socket.destroySoon();
      // A peer that never reads would keep the last bytes, and so the socket, for ever.
      socket.setTimeout(1_000, () => socket.destroy());
    });
  }

  #adopt(socket: Socket): void {
    this.#socket = socket;
    this.#closing = false;
    let failure: Error | undefined;
    socket.setNoDelay(true);
    socket.setKeepAlive(true, keepAliveIdleMs);
    socket.on('data', (bytes) => this.#received.next(bytes as Uint8Array));
    socket.on('error', (error) => {
      failure = error;
    });
    socket.on('end', () => socket.end());
    socket.once('close', () => {
      this.#socket = undefined;
      if (this.#closing) this.#closed.next({ by: 'local' });
      else if (failure) this.#closed.next({ by: 'error', cause: failure });
      else this.#closed.next({ by: 'remote' });
    });
  }
}

function dial(name: string, host: string, port: number, clock: Clock, signal?: AbortSignal): Promise<Socket> {
  return new Promise((resolve, reject) => {
    if (signal?.aborted) return reject(signal.reason);
    const socket = connect({ host, port });
    const settle = (): void => {
      cancelTimeout();
      signal?.removeEventListener('abort', onAbort);
      socket.removeListener('error', onError);
    };
    const fail = (why: string, cause?: unknown): void => {
      settle();
      socket.on('error', () => {});
      socket.destroy();
      reject(new DriverError('LINK_OPEN_FAILED', `${name}: ${why}`, { link: name }, cause));
    };
    const cancelTimeout = clock.at(clock.monotonicMs() + connectTimeoutMs, () =>
      fail('no answer to the connection'),
    );
    const onError = (error: Error): void => fail(error.message, error);
    const onAbort = (): void => fail('opening was cancelled', signal?.reason);
    signal?.addEventListener('abort', onAbort, { once: true });
    socket.once('error', onError);
    socket.once('connect', () => {
      settle();
      resolve(socket);
    });
  });
}

/** Listens on `host:port` (port 0: any free one) and hands over each visitor as an open link. */
export async function listenTcp(
  host: string,
  port: number,
  accept: (visitor: Link) => void,
): Promise<LinkListener & { readonly port: number }> {
  const visitors = new Set<Socket>();
  const server: Server = createServer((socket) => {
    visitors.add(socket);
    socket.once('close', () => visitors.delete(socket));
    accept(TcpLink.over(socket));
  });
  await new Promise<void>((resolve, reject) => {
    server.once('error', (error) => {
      reject(
        new DriverError(
          'LINK_OPEN_FAILED',
          `cannot listen on ${host}:${port}: ${error.message}`,
          { host, port },
          error,
        ),
      );
    });
    server.listen(port, host, resolve);
  });
  const address = server.address();
  const listening = typeof address === 'object' && address ? address.port : port;
  return {
    name: `tcp://${host}:${listening}`,
    port: listening,
    close: () =>
      new Promise((resolve) => {
        server.close(() => resolve());
        for (const socket of visitors) socket.destroy();
      }),
  };
}
