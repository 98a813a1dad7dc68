// A small SCPI instrument for tests of the analyzer driver alone: enough commands to be prepared and swept,
// and a hook that may answer, delay, twist or swallow any message. Its parser and its number formats are
// its own; the simulated analyzer of the mocks is another thing.
import type { Clock } from '../../drivers/clock.ts';
import type { Link } from '../../drivers/link/link.ts';

export type Reply = string | Uint8Array | undefined;

/** What the hook wants done instead; `undefined` lets the instrument go on as usual. */
export interface Twist {
  /** Sent as it is, with the line end; `null` sends nothing at all. */
  reply?: string | Uint8Array | null;
  /** Waits before the usual (or the given) reply leaves. */
  delayMs?: number;
  /** Not even obeyed. */
  ignore?: boolean;
  /** Sent without a line end, then the link is closed. */
  thenDrop?: boolean;
}

export interface ScriptedOptions {
  /** After a comma, between numbers. */
  blank?: string;
  sweepMs?: number;
}

const presets = {
  startHz: 300e3,
  stopHz: 9e9,
  points: 201,
  band: 1000,
  power: 0,
  averages: 16,
  averaging: false,
  continuous: true,
  output: true,
  format: 'ASC',
  border: 'NORM',
  correction: true,
};

const bandwidths = [100, 200, 500, 1000, 1500, 3000, 10000];

export class ScriptedInstrument {
  readonly heard: string[] = [];
  settings = { ...presets };
  parameters = ['S11'];
  selected = 1;
  errors: string[] = [];
  events = 0;
  enable = 0;
  /** How many sweeps were started, and cleared averages. */
  sweeps = 0;
  clears = 0;
  visits = 0;
  frozen = false;
  /** Knows averaging by point; else by whole sweeps only, one of them for each start. */
  averagesByPoint = false;
  sweepMs: number;
  lineEnd = '\r\n';
  identity = 'TESTWERK,VN-2,77,1.0';
  /** Said to every visitor. */
  greet: string | undefined;
  hanging = false;
  twist: (message: string) => Twist | undefined = () => undefined;
  visitor: Link | undefined;
  readonly #clock: Clock;
  readonly #options: ScriptedOptions;
  #line = '';
  #busyUntilMs = 0;
  #reportEnd = false;
  #byPoint = false;

  constructor(clock: Clock, options: ScriptedOptions = {}) {
    this.#clock = clock;
    this.#options = options;
    this.sweepMs = options.sweepMs ?? 200;
  }

  /** Give it to `listen` of a port. One line buffer for all visitors, as on the bench. */
  readonly accept = (visitor: Link): void => {
    this.visitor = visitor;
    this.visits += 1;
    visitor.received$.subscribe((bytes) => this.#hear(visitor, bytes));
    if (this.greet !== undefined) this.say(this.greet);
  };

  /** Sends something that nobody asked for. */
  say(text: string | Uint8Array): void {
    if (this.visitor?.isOpen)
      void this.visitor.write(typeof text === 'string' ? Buffer.from(text, 'latin1') : text);
  }

  leaveHalfLine(text: string): void {
    this.#line = text;
  }

  powerCycle(): void {
    this.settings = { ...presets };
    this.parameters = ['S11'];
    this.errors = [];
    this.events = 128;
    this.#busyUntilMs = 0;
    void this.visitor?.close();
  }

  error(entry: string, bit = 16): void {
    if (this.errors.length >= 16) this.errors[15] = '-350,"Queue overflow"';
    else this.errors.push(entry);
    this.events |= bit;
  }

  #hear(visitor: Link, bytes: Uint8Array): void {
    for (const byte of bytes) {
      if (byte !== 10) {
        this.#line += String.fromCharCode(byte);
        continue;
      }
      const message = this.#line.trim();
      this.#line = '';
      if (message !== '') this.#handle(visitor, message);
    }
  }

  #handle(visitor: Link, message: string): void {
    this.heard.push(message);
    const twist = this.twist(message);
    const own = twist?.ignore ? undefined : this.#obey(message.toUpperCase());
    const usual = twist?.reply === undefined ? own : twist.reply;
    const act = (): void => {
      if (usual !== undefined && usual !== null) this.#send(visitor, usual, twist?.thenDrop ?? false);
      if (twist?.thenDrop) void visitor.close();
    };
    if (twist?.delayMs) this.#clock.at(this.#clock.monotonicMs() + twist.delayMs, act);
    else act();
  }

  #send(visitor: Link, reply: string | Uint8Array, bare: boolean): void {
    if (!visitor.isOpen) return;
    const body = typeof reply === 'string' ? Buffer.from(reply, 'latin1') : Buffer.from(reply);
    const end = bare ? '' : this.lineEnd;
    void visitor.write(Buffer.concat([body, Buffer.from(end)]));
  }

  #obey(message: string): Reply {
    const [head = '', tail = ''] = message.split(/\s+(.*)/);
    const header = head.replace(/^:/, '').replace(/(SENS|SOUR|CALC|INIT)1/, '$1');
    return header.startsWith('*') ? this.#common(header, tail) : this.#device(header, tail);
  }

  #common(header: string, tail: string): Reply {
    if (this.#reportEnd && !this.hanging && this.#clock.monotonicMs() >= this.#busyUntilMs) {
      this.events |= 1;
      this.#reportEnd = false;
    }
    switch (header) {
      case '*IDN?':
        return this.identity;
      case '*ESE':
        this.enable = Number(tail);
        return undefined;
      case '*ESE?':
        return String(this.enable);
      case '*ESR?': {
        const events = this.events;
        this.events = 0;
        return String(events);
      }
      case '*CLS':
        this.events = 0;
        this.errors = [];
        return undefined;
      case '*OPC':
        this.#reportEnd = true;
        return undefined;
      default:
        return this.#unknown(header);
    }
  }

  #device(header: string, tail: string): Reply {
    const plain = header.replace('?', '');
    const define = /^CALC:PAR(\d+):(DEF|SEL)$/.exec(plain);
    if (define) return this.#parameter(Number(define[1]), define[2] ?? '', tail, header.endsWith('?'));
    const key = settingOf[plain];
    if (key) return this.#setting(key, tail, header.endsWith('?'));
    switch (header) {
      case 'SYST:ERR?':
        return this.errors.shift() ?? '+0,"No error"';
      case 'ABOR':
        this.#busyUntilMs = 0;
        this.hanging = false;
        return undefined;
      case 'INIT':
        return this.#start();
      case 'SENS:AVER:CLE':
        this.clears += 1;
        return undefined;
      case 'SENS:SWE:TIME?':
        return String(this.sweepMs / 1000);
      case 'SENS:AVER:MODE':
        if (!this.averagesByPoint) return this.#unknown(header);
        this.#byPoint = tail === 'POIN';
        return undefined;
      case 'SENS:AVER:MODE?':
        if (!this.averagesByPoint) return this.#unknown(header);
        return this.#byPoint ? 'POIN' : 'SWE';
      case 'SENS:SWE:TYPE':
        return undefined;
      case 'CALC:PAR:COUN':
        this.parameters = Array.from({ length: Number(tail) }, (_, i) => this.parameters[i] ?? 'S11');
        return undefined;
      case 'CALC:PAR:COUN?':
        return String(this.parameters.length);
      case 'CALC:DATA?':
        return this.encode(this.trace(this.parameters[this.selected - 1] ?? 'S11'));
      case 'CALC:X?':
      case 'SENS:FREQ:DATA?':
        return this.encode(this.axis());
      default:
        return this.#unknown(header);
    }
  }

  #setting(key: keyof typeof presets, tail: string, asks: boolean): Reply {
    const settings = this.settings as Record<string, number | boolean | string>;
    const now = settings[key];
    if (asks) return typeof now === 'boolean' ? (now ? '1' : '0') : String(now);
    if (typeof now === 'boolean') settings[key] = tail === 'ON' || tail === '1';
    else if (typeof now === 'string') settings[key] = tail;
    else if (key === 'power' && Math.abs(Number(tail)) > 50) this.error('-222,"Data out of range"');
    else if (key === 'band') settings[key] = bandwidths.find((one) => one >= Number(tail)) ?? 10000;
    else settings[key] = Number(tail);
    return undefined;
  }

  #parameter(trace: number, what: string, tail: string, asks: boolean): Reply {
    if (what === 'DEF' && asks) return this.parameters[trace - 1] ?? '';
    if (what === 'DEF') this.parameters[trace - 1] = tail;
    else this.selected = trace;
    return undefined;
  }

  #start(): undefined {
    if (this.settings.continuous || this.#clock.monotonicMs() < this.#busyUntilMs) {
      this.error('-213,"Init ignored"');
      return;
    }
    if (!this.frozen) this.sweeps += 1;
    this.#busyUntilMs =
      this.#clock.monotonicMs() +
      this.sweepMs * (this.#byPoint && this.settings.averaging ? this.settings.averages : 1);
  }

  #unknown(header: string): undefined {
    this.error(`-113,"Undefined header;${header}"`, 32);
  }

  axis(): number[] {
    const { startHz, stopHz, points } = this.settings;
    return Array.from(
      { length: points },
      (_, i) => startHz + ((stopHz - startHz) * i) / Math.max(1, points - 1),
    );
  }

  /** Numbers that tell parameter, point and sweep apart: what a test expects is worked out by `value`. */
  trace(parameter: string): number[] {
    return Array.from({ length: this.settings.points }, (_, i) => this.value(parameter, i)).flat();
  }

  value(parameter: string, point: number): [number, number] {
    return [Number(parameter.slice(1)) / 100 + point / 4096, -this.sweeps / 1024];
  }

  encode(numbers: number[]): string | Uint8Array {
    const { format, border } = this.settings;
    if (format.startsWith('ASC')) {
      return numbers
        .map((n) => `${n < 0 ? '' : '+'}${n.toExponential(11).toUpperCase()}`)
        .join(`,${this.#options.blank ?? ''}`);
    }
    const size = format.includes('64') ? 8 : 4;
    const body = Buffer.alloc(numbers.length * size);
    for (const [i, n] of numbers.entries()) {
      if (size === 8) border === 'NORM' ? body.writeDoubleBE(n, i * 8) : body.writeDoubleLE(n, i * 8);
      else border === 'NORM' ? body.writeFloatBE(n, i * 4) : body.writeFloatLE(n, i * 4);
    }
    return blockOf(body);
  }
}

/** A definite block around some bytes. */
export function blockOf(body: Uint8Array): Uint8Array {
  const length = String(body.length);
  return Buffer.concat([Buffer.from(`#${length.length}${length}`), body]);
}

const settingOf: Record<string, keyof typeof presets> = {
  'SENS:FREQ:STAR': 'startHz',
  'SENS:FREQ:STOP': 'stopHz',
  'SENS:SWE:POIN': 'points',
  'SENS:BAND': 'band',
  'SOUR:POW': 'power',
  'SENS:AVER': 'averaging',
  'SENS:AVER:COUN': 'averages',
  'INIT:CONT': 'continuous',
  OUTP: 'output',
  FORM: 'format',
  'FORM:BORD': 'border',
  'SENS:CORR': 'correction',
};
