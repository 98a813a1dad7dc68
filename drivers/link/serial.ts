// A serial line by the serialport binding. Opened exclusively, without touching the modem lines beyond what
// opening does (a pty has none). Traps it knows: a device that is unplugged closes without an error; a write
// on a closed port never calls back; a peer that merely closes gives no sign at all, so deadlines find it; a
// device that goes before the first read is read as empty for ever, so its file is looked for as well.
import { access } from 'node:fs/promises';
import { type Observable, Subject } from 'rxjs';
import { SerialPort } from 'serialport';
import type { Cancel, Clock } from '../clock.ts';
import { DriverError } from '../errors.ts';
import type { Link, LinkClosed } from './link.ts';

const openTimeoutMs = 5_000;
/** Beyond the time the bytes take on the wire; a line that is held by flow control never ends. */
const writeSlackMs = 3_000;
const bitsPerByte = 10;
const presenceMs = 500;

export interface SerialSettings {
  /** Device file, best the one by the adapter's own identity: /dev/serial/by-id/…, which a replug keeps. */
  path: string;
  baud: number;
}

export class SerialLink implements Link {
  readonly name: string;
  readonly #settings: SerialSettings;
  readonly #clock: Clock;
  readonly #received = new Subject<Uint8Array>();
  readonly #closed = new Subject<LinkClosed>();
  /** Rejects the writes that are on their way when the port closes. */
  readonly #onTheirWay = new Set<(error: DriverError) => void>();
  #port: SerialPort | undefined;
  #closing = false;
  #endWatch: Cancel = () => {};

  constructor(settings: SerialSettings, clock: Clock) {
    this.name = `serial://${settings.path}?baud=${settings.baud}`;
    this.#settings = settings;
    this.#clock = clock;
  }

  get isOpen(): boolean {
    return this.#port !== undefined;
  }

  get received$(): Observable<Uint8Array> {
    return this.#received;
  }

  get closed$(): Observable<LinkClosed> {
    return this.#closed;
  }

  async open(signal?: AbortSignal): Promise<void> {
    signal?.throwIfAborted();
    const { path, baud } = this.#settings;
    const port = new SerialPort({ path, baudRate: baud, autoOpen: false, lock: true });
    await this.#within(openTimeoutMs, (done) => port.open(done)).catch((cause: unknown) => {
      throw new DriverError(
        'LINK_OPEN_FAILED',
        `${this.name}: ${messageOf(cause)}`,
        { link: this.name },
        cause,
      );
    });
    this.#adopt(port);
    if (signal?.aborted) {
      await this.close();
      throw signal.reason;
    }
  }

  write(bytes: Uint8Array): Promise<void> {
    const port = this.#port;
    if (!port) return Promise.reject(this.#notOpen('is not open'));
    const wireMs = (bytes.length * bitsPerByte * 1000) / this.#settings.baud;
    return new Promise((resolve, reject) => {
      const settle = (act: () => void): void => {
        cancel();
        this.#onTheirWay.delete(fail);
        act();
      };
      const fail = (error: DriverError): void => settle(() => reject(error));
      const cancel = this.#clock.at(this.#clock.monotonicMs() + wireMs + writeSlackMs, () =>
        fail(new DriverError('LINK_TIMEOUT', `${this.name} takes no more bytes`, { link: this.name })),
      );
      this.#onTheirWay.add(fail);
      port.write(Buffer.from(bytes), (error) => {
        if (error) fail(this.#notOpen(error.message, error));
        else settle(resolve);
      });
    });
  }

  async close(): Promise<void> {
    const port = this.#port;
    if (!port) return;
    this.#closing = true;
    // Bytes that the other end does not take would keep the port open for ever.
    port.flush(() => {});
    await this.#within(openTimeoutMs, (done) => port.close(done)).catch(() => {
      // A port that cannot be closed is one whose device has gone.
      this.#drop({ by: 'local' });
    });
  }

  #adopt(port: SerialPort): void {
    this.#port = port;
    this.#closing = false;
    let failure: Error | undefined;
    port.on('data', (bytes: Buffer) => this.#received.next(bytes));
    port.on('error', (error) => {
      failure = error;
    });
    port.once('close', (error: (Error & { disconnected?: boolean }) | null | undefined) => {
      if (this.#port !== port) return;
      const cause = error ?? failure;
      if (this.#closing) this.#drop({ by: 'local' });
      else if (error?.disconnected) this.#drop({ by: 'remote', cause: error });
      else this.#drop(cause ? { by: 'error', cause } : { by: 'remote' });
    });
    this.#watchPresence(port);
  }

  #watchPresence(port: SerialPort): void {
    this.#endWatch = this.#clock.at(this.#clock.monotonicMs() + presenceMs, () => {
      access(this.#settings.path).then(
        () => {
          if (this.#port === port) this.#watchPresence(port);
        },
        () => {
          if (this.#port !== port) return;
          this.#drop({ by: 'remote' });
          port.close(() => {});
        },
      );
    });
  }

  #drop(news: LinkClosed): void {
    if (!this.#port) return;
    this.#port = undefined;
    this.#endWatch();
    for (const fail of [...this.#onTheirWay]) fail(this.#notOpen('closed while bytes were on their way'));
    this.#closed.next(news);
  }

  #notOpen(what: string, cause?: Error): DriverError {
    return new DriverError('LINK_CLOSED', `${this.name}: ${what}`, { link: this.name }, cause);
  }

  /** A call of the binding that may never call back. */
  #within(limitMs: number, start: (done: (error: Error | null) => void) => void): Promise<void> {
    return new Promise((resolve, reject) => {
      const cancel = this.#clock.at(this.#clock.monotonicMs() + limitMs, () =>
        reject(new Error(`no answer within ${limitMs} ms`)),
      );
      start((error) => {
        cancel();
        if (error) reject(error);
        else resolve();
      });
    });
  }
}

function messageOf(cause: unknown): string {
  return cause instanceof Error ? cause.message : String(cause);
}
