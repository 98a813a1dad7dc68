// A SCPI instrument that behaves as instruments are allowed to, or as they do all the same: every habit that a
// driver may meet is a quirk that can be switched on. It keeps the truth of what it did (its sweeps, their
// settings and parameters, its output), so that a test can tell a right result from one that only looks right.
import type { Clock } from '../../drivers/clock.ts';
import type { Link, LinkListener } from '../../drivers/link/link.ts';
import { answerForms, blockOf, formNumber } from './quirky-answers.ts';
import { type InstrumentQuirks, plainInstrument } from './quirky-instrument-habits.ts';

type Parameter = 'S11' | 'S21' | 'S12' | 'S22';

export interface InstrumentSettings {
  startHz: number;
  stopHz: number;
  points: number;
  band: number;
  power: number;
  averages: number;
  averaging: boolean;
}

/** One start of the instrument, as it really went. */
export interface SweepRecord {
  id: number;
  startedMs: number;
  /** Set when it went to its end. */
  endedMs: number | undefined;
  /** Passes in the average that it left behind. */
  averaged: number;
  settings: InstrumentSettings;
  parameters: readonly string[];
}

/** What point `index` of a parameter is after a sweep: no two sweeps, points or parameters are alike. */
export function truthOf(sweep: SweepRecord, parameter: Parameter, index: number): [number, number] {
  const base = { S11: 0.11, S21: 0.23, S12: 0.37, S22: 0.53 }[parameter];
  return [base + index * 1e-4 + sweep.id * 1e-5, -base / 3 + sweep.averaged * 1e-3 - sweep.id * 1e-5];
}

const preset: InstrumentSettings = {
  startHz: 300e3,
  stopHz: 8e9,
  points: 201,
  band: 1000,
  power: 0,
  averages: 16,
  averaging: false,
};

export class QuirkyInstrument {
  readonly quirks: InstrumentQuirks;
  readonly sweeps: SweepRecord[] = [];
  readonly heard: string[] = [];
  settings: InstrumentSettings = { ...preset };
  output = true;
  visits = 0;
  #parameters: Parameter[] = ['S11'];
  #selected = 1;
  #continuous = true;
  #byPoint = false;
  #format = 'ASC';
  #order: 'NORM' | 'SWAP' = 'NORM';
  #errors: [number, string][] = [];
  #events = 0;
  #enable = 0;
  #endWanted = false;
  #running: SweepRecord | undefined;
  #data: SweepRecord | undefined;
  #passes = 0;
  #dataQueries = 0;
  #visitor: Link | undefined;
  #muteUntilMs = 0;
  #busySinceMs = Number.NEGATIVE_INFINITY;
  #waiting: { visitor: Link; message: string }[] = [];
  #sendFreeMs = 0;
  #epoch = 0;
  #listener: LinkListener | undefined;
  readonly #clock: Clock;

  constructor(clock: Clock, quirks: Partial<InstrumentQuirks> = {}) {
    this.#clock = clock;
    this.quirks = { ...plainInstrument, ...quirks };
    this.#powerUp();
  }

  /** Opens its port; closed again while it boots. */
  serve(port: { listen(accept: (visitor: Link) => void): LinkListener }): void {
    this.#listener = port.listen(this.accept);
    this.#reopen = () => {
      this.#listener = port.listen(this.accept);
    };
  }

  #reopen: () => void = () => {};

  readonly accept = (visitor: Link): void => {
    this.visits += 1;
    const { sessions, lingerMs, muteAfterReconnectMs, greeting } = this.quirks;
    const nowMs = this.#clock.monotonicMs();
    const taken = this.#visitor?.isOpen || nowMs - this.#busySinceMs < lingerMs;
    if (taken && sessions === 'refused') {
      void visitor.close();
      return;
    }
    if (taken && sessions === 'mute') return;
    this.#visitor = visitor;
    if (this.visits > 1) this.#muteUntilMs = Math.max(this.#muteUntilMs, nowMs + muteAfterReconnectMs);
    let line = '';
    visitor.received$.subscribe((bytes) => {
      for (const byte of bytes) {
        if (byte !== 10) line += String.fromCharCode(byte);
        else {
          this.#hear(visitor, line.trim());
          line = '';
        }
      }
    });
    visitor.closed$.subscribe(() => {
      this.#busySinceMs = this.#clock.monotonicMs();
      this.#sendFreeMs = 0;
    });
    if (greeting !== undefined && !this.quirks.silent) this.#send(visitor, Buffer.from(`${greeting}\n`));
  };

  /** The mains fail and come back: the link is dead at once, the port refuses, then there is a booted instrument. */
  cutPower(): void {
    this.#epoch += 1;
    void this.#visitor?.close();
    void this.#listener?.close();
    this.settings = { ...preset };
    this.#parameters = ['S11'];
    this.#continuous = true;
    this.#format = 'ASC';
    this.#order = 'NORM';
    this.#errors = [];
    this.#waiting = [];
    this.#running = this.#data = undefined;
    this.#endWanted = false;
    this.output = true;
    this.#powerUp();
    this.#after(this.quirks.bootMs, () => this.#reopen());
    // Open before it is ready: it answers some time later.
    this.#muteUntilMs = this.#clock.monotonicMs() + this.quirks.bootMs * 1.2;
  }

  /** Somebody at the front panel. */
  touch(change: Partial<InstrumentSettings> & { continuous?: boolean; select?: number }): void {
    const { continuous, select, ...settings } = change;
    this.#set(settings);
    if (continuous !== undefined) this.#continuous = continuous;
    if (select !== undefined) this.#selected = select;
  }

  dropLink(): void {
    void this.#visitor?.close();
  }

  say(text: string): void {
    if (this.#visitor?.isOpen) this.#send(this.#visitor, Buffer.from(text, 'latin1'));
  }

  #powerUp(): void {
    this.#events = this.quirks.powerOnBit ? 128 : 0;
    if (this.quirks.staleOperationComplete) this.#events |= 1;
    if (this.quirks.powerOnError) this.#errors.push([-500, 'Power on']);
  }

  #hear(visitor: Link, message: string): void {
    if (message === '' || this.quirks.silent) return;
    const nowMs = this.#clock.monotonicMs();
    if (nowMs < this.#muteUntilMs) return;
    if (this.#running && this.quirks.deafWhileSweeping) this.#waiting.push({ visitor, message });
    else this.#handle(visitor, message);
  }

  #handle(visitor: Link, message: string): void {
    this.heard.push(message);
    const answer = this.#obey(message);
    if (answer === undefined || !visitor.isOpen) return;
    const echo = this.quirks.headerEcho && message.startsWith(':');
    const header = echo ? `${message.slice(0, message.indexOf('?'))} ` : '';
    const text = typeof answer === 'string';
    const body = Buffer.concat([Buffer.from(header), Buffer.from(answer as string, 'latin1')]);
    if (!text && this.quirks.halfBlockAt === this.#dataQueries) {
      this.#dataQueries += 1;
      this.#send(visitor, body.subarray(0, body.length / 2));
      this.#after(1, () => void visitor.close());
      return;
    }
    const { lineEnd, blockTail } = this.quirks;
    this.#send(visitor, Buffer.concat([body, Buffer.from(text ? lineEnd : blockTail, 'latin1')]), !text);
  }

  #send(visitor: Link, bytes: Uint8Array, isBlock = false): void {
    const { pieceBytes, pauseMs, answerDelayMs } = this.quirks;
    const size = Math.max(1, Math.min(pieceBytes, bytes.length));
    const delayMs = answerDelayMs(this.heard.length);
    let dueMs = Math.max(this.#sendFreeMs, this.#clock.monotonicMs() + delayMs);
    for (let at = 0; at < bytes.length; at += size) {
      const piece = Uint8Array.from(bytes.subarray(at, at + size));
      if (isBlock && at <= bytes.length / 2 && at + size > bytes.length / 2) dueMs += pauseMs;
      this.#clock.at(dueMs, () => {
        if (visitor.isOpen) visitor.write(piece).catch(() => {});
      });
    }
    this.#sendFreeMs = dueMs;
  }

  #obey(message: string): string | Uint8Array | undefined {
    const [head = '', tail = ''] = message.split(/\s+(.*)/);
    const plain = head
      .toUpperCase()
      .replace(/^:/, '')
      .replace(/(SENS|SOUR|CALC|INIT)1/, '$1');
    const asks = plain.endsWith('?');
    const name = asks ? plain.slice(0, -1) : plain;
    if (name.startsWith('*')) return this.#common(name, tail, asks);
    const parameter = /^CALC:PAR(\d+):(DEF|SEL)$/.exec(name);
    if (parameter) return this.#parameter(Number(parameter[1]), parameter[2] === 'SEL', tail, asks);
    const handler = this.#commands[name];
    if (!handler || this.quirks.unknown.some((each) => `${name}${asks ? '?' : ''}` === each)) {
      return this.#refuse(-113, `Undefined header;${head}`, 32);
    }
    return handler(tail, asks);
  }

  #refuse(code: number, text: string, bit = 16): undefined {
    this.#events |= bit;
    if (this.#errors.length < this.quirks.errorQueue) this.#errors.push([code, text]);
    else this.#errors[this.#errors.length - 1] = [-350, 'Queue overflow'];
    return undefined;
  }

  #common(name: string, tail: string, asks: boolean): string | undefined {
    if (name === '*IDN' && asks) return this.quirks.identity;
    if (name === '*ESE' && !asks) this.#enable = Number(tail);
    else if (name === '*ESE') return this.#number(this.#enable);
    else if (name === '*ESR' && asks) {
      const events = this.#events;
      this.#events = this.quirks.completeSticks === 'no' ? 0 : events & 1;
      return this.#number(events);
    } else if (name === '*CLS') {
      this.#events = this.quirks.completeSticks === 'for-ever' ? this.#events & 1 : 0;
      this.#errors = [];
      this.#endWanted = false;
    } else if (name === '*OPC' && !asks && this.quirks.operationComplete) {
      if (this.#running && !this.quirks.completeAtOnce) this.#endWanted = true;
      else this.#events |= 1;
    } else return this.#refuse(-113, `Undefined header;${name}`, 32);
    return undefined;
  }

  readonly #commands: Record<string, (tail: string, asks: boolean) => string | Uint8Array | undefined> = {
    'SENS:FREQ:STAR': (tail, asks) => this.#setting('startHz', tail, asks),
    'SENS:FREQ:STOP': (tail, asks) => this.#setting('stopHz', tail, asks),
    'SENS:SWE:POIN': (tail, asks) => this.#setting('points', tail, asks),
    'SENS:BAND': (tail, asks) => this.#setting('band', tail, asks),
    'SOUR:POW': (tail, asks) => this.#setting('power', tail, asks),
    'SENS:AVER:COUN': (tail, asks) => this.#setting('averages', tail, asks),
    'SENS:AVER': (tail, asks) => {
      if (asks) return this.#boolean(this.settings.averaging);
      this.#set({ averaging: tail === 'ON' });
      return undefined;
    },
    'SENS:AVER:CLE': () => {
      this.#passes = 0;
      return undefined;
    },
    'SENS:AVER:MODE': (tail, asks) => {
      if (this.quirks.averaging !== 'by-point') return this.#refuse(-113, 'Undefined header;AVER:MODE', 32);
      if (asks) return this.#byPoint ? 'POINT' : 'SWEEP';
      this.#byPoint = tail.startsWith('POIN');
      return undefined;
    },
    'SENS:SWE:TYPE': (_, asks) => (asks ? 'LIN' : undefined),
    'SENS:SWE:TIME': (_, asks) => (asks ? this.#sweepTime() : undefined),
    'SENS:CORR': (_, asks) => (asks ? this.#boolean(true) : undefined),
    'TRIG:SOUR': () => undefined,
    OUTP: (tail, asks) => {
      if (asks) return this.#boolean(this.output);
      if (tail === 'ON' || !this.quirks.sourceStuck) this.output = tail === 'ON';
      return undefined;
    },
    'INIT:CONT': (tail, asks) => {
      if (asks) return this.#boolean(this.#continuous);
      this.#continuous = tail === 'ON';
      return undefined;
    },
    INIT: () => this.#start(),
    ABOR: () => this.#abort(),
    FORM: (tail, asks) => {
      if (asks) return answerForms.format(this.#format, this.quirks.formatWord);
      this.#format = tail;
      return undefined;
    },
    'FORM:BORD': (tail, asks) => {
      if (asks)
        return this.quirks.longWords
          ? `${this.#order}${{ NORM: 'AL', SWAP: 'PED' }[this.#order]}`
          : this.#order;
      this.#order = tail.startsWith('SWAP') ? 'SWAP' : 'NORM';
      return undefined;
    },
    'CALC:PAR:COUN': (tail, asks) => {
      if (asks) return this.#number(this.#parameters.length);
      this.#parameters = Array.from({ length: Number(tail) }, (_, index) => this.#parameters[index] ?? 'S11');
      return this.#changed();
    },
    'CALC:DATA': () => this.#trace(),
    'CALC:X': () => {
      const { startHz, stopHz, points } = this.settings;
      const stepHz = points > 1 ? (stopHz - startHz) / (points - 1) : 0;
      return this.#numbers(Array.from({ length: points }, (_, index) => startHz + index * stepHz));
    },
    'SYST:ERR': () => {
      const [code, text] = this.#errors.shift() ?? [0, 'No error'];
      return answerForms.error(code, text, this.quirks.errorForm);
    },
  };

  #setting(
    name: Exclude<keyof InstrumentSettings, 'averaging'>,
    tail: string,
    asks: boolean,
  ): string | undefined {
    if (asks) return this.#number(this.settings[name]);
    this.#set({ [name]: Number(tail) });
    return undefined;
  }

  #set(change: Partial<InstrumentSettings>): void {
    const { frequencyDigits, bandwidths } = this.quirks;
    const round = (hz: number): number =>
      frequencyDigits === 'hertz' ? Math.round(hz) : Number(hz.toPrecision(15));
    if (change.startHz !== undefined) change.startHz = round(change.startHz);
    if (change.stopHz !== undefined) change.stopHz = round(change.stopHz);
    if (change.band !== undefined && bandwidths) {
      const asked = change.band;
      change.band = bandwidths.find((each) => each >= asked) ?? Math.max(...bandwidths);
    }
    Object.assign(this.settings, change);
    this.#changed();
  }

  #changed(): undefined {
    this.#passes = 0;
    if (!this.quirks.oldDataReadable) this.#data = undefined;
    return undefined;
  }

  #parameter(trace: number, select: boolean, tail: string, asks: boolean): string | undefined {
    if (trace < 1 || trace > this.#parameters.length)
      return this.#refuse(-114, 'Header suffix out of range', 32);
    if (select) this.#selected = trace;
    else if (asks) return this.#parameters[trace - 1];
    else {
      this.#parameters[trace - 1] = tail as Parameter;
      this.#changed();
    }
    return undefined;
  }

  #sweepTime(): string | undefined {
    const seconds = (this.quirks.statedSweepMs ?? this.quirks.sweepMs) / 1000;
    const { sweepTime } = this.quirks;
    if (sweepTime === 'zero') return '0';
    if (sweepTime === 'nan') return 'nan';
    if (sweepTime === 'overflow') return '9.91E37';
    return sweepTime === 'milliseconds' ? seconds.toFixed(3) : this.#number(seconds);
  }

  #start(): undefined {
    if (this.#continuous || this.#running) return this.#refuse(-213, 'Init ignored');
    const { averaging, averages } = this.settings;
    const all = averaging && (this.#byPoint || this.quirks.averaging === 'start-all');
    const record: SweepRecord = {
      id: this.sweeps.length + 1,
      startedMs: this.#clock.monotonicMs(),
      endedMs: undefined,
      averaged: all ? averages : averaging ? this.#passes + 1 : 1,
      settings: { ...this.settings },
      parameters: [...this.#parameters],
    };
    this.sweeps.push(record);
    this.#running = record;
    this.#after(this.quirks.sweepMs * (all ? averages : 1), () => {
      if (this.#running !== record) return;
      record.endedMs = this.#clock.monotonicMs();
      this.#passes = record.averaged;
      this.#data = record;
      this.#ended();
    });
    return undefined;
  }

  #abort(): undefined {
    if (this.#running) this.#ended();
    return undefined;
  }

  #ended(): void {
    this.#running = undefined;
    if (this.#endWanted) this.#events |= 1;
    this.#endWanted = false;
    while (!this.#running) {
      const next = this.#waiting.shift();
      if (!next) return;
      this.#handle(next.visitor, next.message);
    }
  }

  #trace(): string | Uint8Array | undefined {
    const data = this.#data;
    const parameter = this.#parameters[this.#selected - 1];
    if (!data || !parameter) return this.#refuse(-230, 'Data corrupt or stale');
    const values = Array.from({ length: this.settings.points }, (_, index) =>
      truthOf(data, parameter, index),
    );
    return this.#numbers(values.flat());
  }

  #numbers(values: number[]): string | Uint8Array {
    if (this.#format.startsWith('ASC'))
      return values.map((value) => formNumber(value, 'signed')).join(this.quirks.commaBlank ? ', ' : ',');
    this.#dataQueries += 1;
    return blockOf(
      values,
      this.#format.endsWith('64') ? 8 : 4,
      this.#order === 'SWAP',
      this.quirks.lengthDigits,
    );
  }

  #number(value: number): string {
    return formNumber(value, this.quirks.numbers);
  }

  #boolean(value: boolean): string {
    return this.quirks.booleanWords ? (value ? 'ON' : 'OFF') : value ? '1' : '0';
  }

  #after(ms: number, act: () => void): void {
    const epoch = this.#epoch;
    this.#clock.at(this.#clock.monotonicMs() + ms, () => {
      if (epoch === this.#epoch) act();
    });
  }
}
