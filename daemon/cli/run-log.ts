// The log beside the archive: one JSON line per happening, with the bytes of whatever could not be read.
import pino, { type Logger } from 'pino';
import { DaemonError } from '../errors.ts';
import type { RunEvent } from '../run/events.ts';

function openDestination(path: string): pino.DestinationStream {
  try {
    return pino.destination({ dest: path, sync: true });
  } catch (cause) {
    const why = cause instanceof Error ? cause.message : String(cause);
    throw new DaemonError('ARCHIVE_UNUSABLE', `${path}: the log cannot be written: ${why}`, { path }, cause);
  }
}

export interface RunLog {
  note(event: RunEvent): void;
  failed(error: unknown): void;
}

/** `path` is the archive's path with `.log` added; the folder exists because the archive is in it. */
export function openRunLog(path: string): RunLog {
  const log: Logger = pino({ base: null, timestamp: pino.stdTimeFunctions.isoTime }, openDestination(path));
  return {
    note(event) {
      if (event.kind === 'sample') {
        const { sequence, purpose, cut, angleDeg, attempt } = event.sample;
        log.info({ sequence, purpose, cut, angleDeg, attempt }, 'sample');
      } else if (event.kind === 'retry') log.warn({ ...event }, 'retry');
      else if (event.kind === 'trouble') log.error({ ...event }, 'trouble');
      else log.info({ ...event }, event.kind);
    },
    failed(error) {
      const facts = (error as { facts?: unknown }).facts;
      const code = (error as { code?: unknown }).code;
      log.error({ err: error, code, facts }, 'failed');
    },
  };
}
