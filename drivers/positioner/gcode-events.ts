// What a controller says unasked, and waiting for it. The sender makes these events; the positioner's parts
// listen. Also the bytes that cause most of them, which overtake every line.
import type { Observable } from 'rxjs';
import type { Clock } from '../clock.ts';
import type { LinkClosed } from '../link/link.ts';
import type { ControllerLine, StatusReport } from './gcode-reports.ts';

/** Bytes that the controller takes out of the stream at once, without an acknowledgement. */
export const urgentBytes = {
  report: 0x3f,
  hold: 0x21,
  softReset: 0x18,
  feedOverride100: 0x90,
  rapidOverride100: 0x95,
} as const;

export type SenderEvent =
  | { kind: 'report'; report: StatusReport; monotonicMs: number }
  | { kind: 'alarm'; number: number }
  /** `asked`: the banner answers our own reset. */
  | { kind: 'restart'; banner: string; asked: boolean }
  | { kind: 'closed'; news: LinkClosed }
  /** Any other line that no exchange was waiting for, late answers included. */
  | { kind: 'stray'; line: ControllerLine };

export interface EventWait<T> {
  /** What is waited for; undefined for other events. What it throws ends the wait. */
  pick: (event: SenderEvent) => T | undefined;
  withinMs: number;
  signal?: AbortSignal | undefined;
}

/** The first event that `pick` makes something of; undefined when there was none in time. */
export function nextEvent<T>(
  events$: Observable<SenderEvent>,
  clock: Clock,
  { pick, withinMs, signal }: EventWait<T>,
): Promise<T | undefined> {
  return new Promise((resolve, reject) => {
    if (signal?.aborted) return reject(signal.reason);
    const finish = (act: () => void): void => {
      cancel();
      subscription.unsubscribe();
      signal?.removeEventListener('abort', onAbort);
      act();
    };
    const onAbort = (): void => finish(() => reject(signal?.reason));
    const cancel = clock.at(clock.monotonicMs() + withinMs, () => finish(() => resolve(undefined)));
    const subscription = events$.subscribe((event) => {
      try {
        const picked = pick(event);
        if (picked !== undefined) finish(() => resolve(picked));
      } catch (error) {
        finish(() => reject(error));
      }
    });
    signal?.addEventListener('abort', onAbort, { once: true });
  });
}
