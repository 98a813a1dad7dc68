// What a controller of the realtime-status family sends, line by line, as typed values. Pure; a line that is
// damaged or not known becomes `unknown` and is never guessed at. Tables of meanings are in gcode-meanings.ts.
import { damageMark } from '../link/lines.ts';

export interface StatusReport {
  /** The state's name alone, such as `Hold`. */
  state: string;
  /** The number after the name: for `Hold` and `Door` it tells still (0, 1 for a door) from decelerating. */
  sub: number | undefined;
  /** As sent, such as `Hold:1`; for the log and the page. */
  stateText: string;
  /** Controller units, one per axis. One of `machine` and `work` is always there. */
  machine: readonly number[] | undefined;
  work: readonly number[] | undefined;
  /** Work offset: work = machine − offset. Sent only now and then. */
  offset: readonly number[] | undefined;
  /** Feed override in percent; sent now and then. */
  feedOverridePercent: number | undefined;
  /** Letters of the inputs that are active; empty when none. */
  pins: string;
}

export type ControllerLine =
  | { kind: 'ok' }
  | { kind: 'error'; number: number }
  | { kind: 'report'; report: StatusReport }
  | { kind: 'alarm'; number: number }
  | { kind: 'banner'; text: string }
  | { kind: 'message'; text: string }
  | { kind: 'data'; key: string; value: string }
  | { kind: 'setting'; number: number; value: string }
  | { kind: 'startup'; text: string }
  /** A line that only the position-report family sends. */
  | { kind: 'foreign'; text: string }
  | { kind: 'empty' }
  | { kind: 'unknown'; text: string };

/** Firmwares of the family put their own name behind the first four letters, and more words before the bracket. */
const bannerLine = /^Grbl[\w-]* v?\d+\.\d+\S* (?:\S+ )?\[/i;
const foreignLine = /^(?:start$|echo:|FIRMWARE_NAME:|Cap:|Marlin\b|Resend:|Error:|X:-?[\d.]+ Y:.*Count)/;
const reportLine = /^<([A-Z][A-Za-z]*)(?::(\d+))?((?:\|[^|<>]*)*)>$/;
const plainNumber = /^-?\d+(?:\.\d*)?$/;

/** One line, without its end, as received. Never throws. */
export function readLine(text: string): ControllerLine {
  if (text === '') return { kind: 'empty' };
  if (text === 'ok') return { kind: 'ok' };
  if (text.startsWith('<')) {
    const report = readReport(text);
    return report ? { kind: 'report', report } : { kind: 'unknown', text };
  }
  if (bannerLine.test(text)) return { kind: 'banner', text };
  if (text.includes(damageMark)) return { kind: 'unknown', text };
  return readNumbered(text) ?? readBracket(text) ?? readRest(text);
}

function readNumbered(text: string): ControllerLine | undefined {
  const answer = /^(error|ALARM):(\d+)$/.exec(text);
  if (answer) return { kind: answer[1] === 'error' ? 'error' : 'alarm', number: Number(answer[2]) };
  // Releases before 1.1 put a remark in brackets behind the value.
  const setting = /^\$(\d+)=([^(]*?)\s*(?:\(.*\))?$/.exec(text);
  if (setting) return { kind: 'setting', number: Number(setting[1]), value: setting[2] ?? '' };
  return undefined;
}

function readBracket(text: string): ControllerLine | undefined {
  const bracket = /^\[([A-Za-z0-9]+):(.*)\]$/.exec(text);
  if (!bracket) return undefined;
  const [, key = '', value = ''] = bracket;
  return key === 'MSG' ? { kind: 'message', text: value } : { kind: 'data', key, value };
}

function readRest(text: string): ControllerLine {
  if (/^>.*:(?:ok|error:\d+)$/.test(text)) return { kind: 'startup', text };
  if (foreignLine.test(text)) return { kind: 'foreign', text };
  return { kind: 'unknown', text };
}

/** A status report, or undefined when the text is none, is damaged, or contradicts itself. */
export function readReport(text: string): StatusReport | undefined {
  const parts = reportLine.exec(text);
  if (!parts || text.includes(damageMark)) return undefined;
  const [, state = '', sub, tail = ''] = parts;
  const fields = new Map<string, string>();
  for (const field of tail.split('|').slice(1)) {
    const colon = field.indexOf(':');
    if (colon > 0) fields.set(field.slice(0, colon), field.slice(colon + 1));
  }
  const machine = readNumbers(fields.get('MPos'));
  const work = readNumbers(fields.get('WPos'));
  const offset = readNumbers(fields.get('WCO'));
  const overrides = readNumbers(fields.get('Ov'));
  const axes = (machine ?? work)?.length;
  const damaged = [machine, work, offset, overrides].includes(null);
  if (damaged || axes === undefined || (offset && offset.length !== axes)) return undefined;
  return {
    state,
    sub: sub === undefined ? undefined : Number(sub),
    stateText: sub === undefined ? state : `${state}:${sub}`,
    machine: machine ?? undefined,
    work: work ?? undefined,
    offset: offset ?? undefined,
    feedOverridePercent: overrides?.[0],
    pins: fields.get('Pn') ?? '',
  };
}

/** undefined: not there; null: there, but no list of numbers. `+ 0` turns the firmware's −0 into 0. */
function readNumbers(text: string | undefined): number[] | undefined | null {
  if (text === undefined) return undefined;
  const words = text.split(',');
  return words.every((word) => plainNumber.test(word)) ? words.map((word) => Number(word) + 0) : null;
}

/**
 * The machine position of a report in controller units, from the work position where the controller sends
 * that one; undefined while the offset (the latest one heard) is not known.
 */
export function machinePosition(
  report: StatusReport,
  latestOffset: readonly number[] | undefined,
): readonly number[] | undefined {
  if (report.machine) return report.machine;
  const offset = report.offset ?? latestOffset;
  if (!report.work || offset?.length !== report.work.length) return undefined;
  return report.work.map((value, index) => value + (offset[index] ?? 0));
}

/** True while the shaft may turn. The position still changes in `Hold:1` and in `Door:2` and `Door:3`. */
export function isMoving(report: StatusReport): boolean {
  if (report.state === 'Hold') return report.sub === 1;
  if (report.state === 'Door') return report.sub === 2 || report.sub === 3;
  return report.state === 'Run' || report.state === 'Jog' || report.state === 'Home';
}

/** True in the states that wait for a person: somebody pressed hold, or a door is open. */
export function isHeld(report: StatusReport): boolean {
  return report.state === 'Hold' || report.state === 'Door';
}

/**
 * The working plane (17, 18 or 19) in the value of a parser-state line (`GC:`); undefined when there is none.
 * Straight moves do not care for it, and after any reset it is 17: see `setModes`.
 */
export function planeInParserState(value: string): number | undefined {
  const plane = /(?:^|\s)G(17|18|19)(?:\s|$)/.exec(value);
  return plane ? Number(plane[1]) : undefined;
}
