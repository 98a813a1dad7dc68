// How what a controller does or fails to do is said as an error: codes, messages and facts of the exchanges in
// gcode-sender.ts. Decides nothing.
import { DriverError } from '../errors.ts';
import type { LinkClosed } from '../link/link.ts';
import { alarmMeaning, refusalMeaning } from './gcode-meanings.ts';

/** POSITIONER_ALARM with what the number means and whether the position survived. */
export function alarmError(number: number | undefined, link: string): DriverError {
  if (number === undefined) {
    return new DriverError('POSITIONER_ALARM', `${link} is locked by an alarm`, { positionKnown: false });
  }
  const { meaning, positionKnown, wayOut } = alarmMeaning(number);
  return new DriverError('POSITIONER_ALARM', `${link}: alarm ${number}, ${meaning}`, {
    alarm: number,
    meaning,
    positionKnown,
    wayOut,
  });
}

/** POSITIONER_COMMAND_REFUSED with what the number means. */
export function refusedError(number: number, line: string, link: string): DriverError {
  const meaning = refusalMeaning(number);
  return new DriverError('POSITIONER_COMMAND_REFUSED', `${link} refused ${line}: ${meaning}`, {
    line,
    error: number,
    meaning,
  });
}

/** POSITIONER_NOT_ANSWERING; the answer may still come. */
export function notAnsweringError(line: string, withinMs: number, link: string): DriverError {
  return new DriverError('POSITIONER_NOT_ANSWERING', `${link} did not answer ${line} in ${withinMs} ms`, {
    line,
    withinMs,
  });
}

export function linkClosedError(link: string, news?: LinkClosed): DriverError {
  const facts = { link, ...(news ? { by: news.by } : {}) };
  return new DriverError('LINK_CLOSED', `${link} is closed`, facts, news?.cause);
}
