// How what a position-report controller does or fails to do is said as an error. Decides nothing.
import { DriverError } from '../errors.ts';
import type { LinkClosed } from '../link/link.ts';

export function haltedError(text: string, link: string): DriverError {
  return new DriverError(
    'POSITIONER_ALARM',
    `${link} has halted itself and needs its reset button: ${text}`,
    {
      said: text.slice(0, 200),
      meaning: 'halted: a switch was not found, a fault of the machine, or an emergency stop',
      positionKnown: false,
      wayOut: 'hardware reset',
    },
  );
}

export function refusedLine(line: string, said: string, link: string): DriverError {
  return new DriverError('POSITIONER_COMMAND_REFUSED', `${link} refused ${line}: ${said}`, { line, said });
}

/** The answer may still come. */
export function unansweredLine(line: string, withinMs: number, link: string): DriverError {
  return new DriverError('POSITIONER_NOT_ANSWERING', `${link} did not answer ${line} in ${withinMs} ms`, {
    line,
    withinMs,
  });
}

export function restartedError(link: string, how: string): DriverError {
  return new DriverError('POSITIONER_RESTARTED', `${link} restarted: ${how}`, { link, how });
}

export function pausedError(link: string, said: string): DriverError {
  return new DriverError('POSITIONER_HELD', `${link} waits for somebody at the machine: ${said}`, { said });
}

export function closedError(link: string, news?: LinkClosed): DriverError {
  const facts = { link, ...(news ? { by: news.by } : {}) };
  return new DriverError('LINK_CLOSED', `${link} is closed`, facts, news?.cause);
}
