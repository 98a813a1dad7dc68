// Lines that begin with a dollar sign: settings, queries, unlock, homing, sleep. What is allowed when is the
// point here; the controller carries out what is more than an answer.
import { readNumber } from './gcode-words.ts';
import type { Settings } from './settings.ts';

/** What a `$` line comes to: lines to print before `ok`, an error, or something the controller must do. */
export type DollarOutcome =
  | { kind: 'print'; lines: string[] }
  | { kind: 'error'; number: number }
  | { kind: 'jog'; text: string }
  | { kind: 'home' | 'sleep' | 'unlock' | 'check' }
  | { kind: 'stored'; setting: number };

export interface DollarFacts {
  state: string;
  extended: boolean;
  settings: Settings;
  /** `$I=` text. */
  userText: { value: string };
  /** `$N0` and `$N1`. */
  startLines: string[];
  modeLine: () => string;
  offsetLines: () => string[];
  versionLines: () => string[];
}

const help = '[HLP:$$ $# $G $I $N $x=val $Nx=line $J=line $SLP $C $X $H ~ ! ? ctrl-x]';

/** `text` is condensed and begins with `$`; `raw` is the line as it came. */
export function readDollarLine(text: string, raw: string, facts: DollarFacts): DollarOutcome {
  const isRestOrAlarm = facts.state === 'Idle' || facts.state === 'Alarm';
  const isMoving = facts.state === 'Run' || facts.state === 'Hold';
  if (text.startsWith('$J')) return readJogLine(text, facts.state);
  switch (text) {
    case '$':
      return print(help);
    case '$G':
      return print(facts.modeLine());
    case '$X':
      return { kind: 'unlock' };
    case '$C':
      return facts.state === 'Idle' || facts.state === 'Check' ? { kind: 'check' } : refuse(8);
    case '$$':
      return isMoving ? refuse(8) : print(...facts.settings.lines());
  }
  if (!isRestOrAlarm) return refuse(8);
  switch (text) {
    case '$#':
      return print(...facts.offsetLines());
    case '$I':
      return print(...facts.versionLines());
    case '$H':
      return facts.settings.value(22) === 0 ? refuse(5) : { kind: 'home' };
    case '$SLP':
      return { kind: 'sleep' };
    case '$N':
      return print(...facts.startLines.map((line, index) => `$N${index}=${line}`));
  }
  if (text.startsWith('$I=')) {
    facts.userText.value = raw.slice(raw.indexOf('=') + 1).trim();
    return print();
  }
  const startLine = /^\$N([01])=(.*)$/.exec(text);
  if (startLine) {
    facts.startLines[Number(startLine[1])] = startLine[2]!;
    return print();
  }
  return readSettingLine(text, facts);
}

function readJogLine(text: string, state: string): DollarOutcome {
  if (state !== 'Idle' && state !== 'Jog') return refuse(8);
  return text[2] === '=' ? { kind: 'jog', text: text.slice(3) } : refuse(3);
}

function readSettingLine(text: string, facts: DollarFacts): DollarOutcome {
  const number = readNumber(text, 1);
  if (!number) return refuse(2);
  if (facts.extended && number.next === text.length) {
    const line = facts.settings.line(number.value);
    return line === undefined ? refuse(3) : print(line);
  }
  if (text[number.next] !== '=') return refuse(3);
  const value = readNumber(text, number.next + 1);
  if (!value) return refuse(2);
  if (value.next !== text.length || number.value > (facts.extended ? 999 : 255)) return refuse(3);
  const refusal = facts.settings.store(number.value, value.value);
  return refusal === undefined ? { kind: 'stored', setting: number.value } : refuse(refusal);
}

function print(...lines: string[]): DollarOutcome {
  return { kind: 'print', lines };
}

function refuse(number: number): DollarOutcome {
  return { kind: 'error', number };
}
