// What a wire offers, whatever it is made of: bytes out, bytes in, and the news that it has closed.
// A driver is written over this and over a Clock, never over a socket.
import type { Observable } from 'rxjs';

export interface LinkClosed {
  /** `local`: we closed it; `remote`: the other end closed or died; `error`: the wire failed. */
  by: 'local' | 'remote' | 'error';
  cause?: Error;
}

export interface Link {
  /** For messages and the log, such as `tcp://127.0.0.1:5025`. */
  readonly name: string;
  readonly isOpen: boolean;
  /** Bytes as they arrive, in pieces of any size. Hot: nothing is kept for late listeners. */
  readonly received$: Observable<Uint8Array>;
  /** One value each time an open link closes, whoever closed it. Never errors, never completes. */
  readonly closed$: Observable<LinkClosed>;
  /** Opens, or reopens after a close. Throws LINK_OPEN_FAILED. Opening an open link is a bug. */
  open(signal?: AbortSignal): Promise<void>;
  /** Resolves when the bytes were handed to the wire. Throws LINK_CLOSED when it is not open. */
  write(bytes: Uint8Array): Promise<void>;
  /** Closes and resolves when closed. Closing a closed link does nothing. */
  close(): Promise<void>;
}

/** The accepting side, used by the simulated bench: each visitor is a link that is already open. */
export interface LinkListener {
  readonly name: string;
  close(): Promise<void>;
}
