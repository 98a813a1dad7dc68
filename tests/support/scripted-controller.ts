// A small controller of the realtime-status family for the positioner's own tests: enough of the wire's facts
// to be moved, held, reset, homed and hurt. Straight constant-rate motion; everything it is sent is kept.
// Apart from the project's simulated bench on purpose.
import type { Clock } from '../../drivers/clock.ts';
import type { Link } from '../../drivers/link/link.ts';

export interface ScriptedOptions {
  axisCount?: number;
  reportsWork?: boolean;
  offset?: number[];
  startAt?: number[];
  startState?: string;
  settings?: Record<number, string>;
  settingsReversed?: boolean;
  identity?: string[];
  /** Where the homing cycle leaves the axes; undefined: the switch is never found. */
  homedAt?: number[];
  homingMs?: number;
  /** After an opening: silence, then junk and the banner, position at zero. */
  resetsOnOpen?: { bootMs: number; junk: string };
  /** Reports are sent by themselves at this interval. */
  autoReportMs?: number;
}

const defaults: Record<number, string> = {
  0: '10',
  1: '255',
  10: '1',
  13: '0',
  20: '0',
  22: '1',
  25: '1200',
  32: '0',
};

export class ScriptedController {
  readonly lines: string[] = [];
  readonly urgent: { byte: number; ms: number }[] = [];
  /** Says what becomes of an outgoing line: the text to send, or undefined to lose it. */
  spoil: (text: string) => string | undefined = (text) => text;
  /** Answers in place of the controller where it returns lines. */
  answerInstead: (line: string) => string[] | undefined = () => undefined;
  mute = false;
  /** A restart happened whose banner nobody could hear. */
  restartedUnseen = false;
  /** Takes no notice of holds. */
  ignoresHold = false;
  state: string;
  feed = 0;
  plane = 17;
  readonly #clock: Clock;
  readonly #options: ScriptedOptions;
  readonly #axisCount: number;
  #wire: Link | undefined;
  #inbox: string[] = [];
  #text = '';
  #busy = false;
  #epoch = 0;
  #from: number[];
  #to: number[];
  #startMs = 0;
  #endMs = 0;
  #deafUntilMs = 0;
  #reports = 0;
  #stalledAt: number[] | undefined;
  #shaftOffset: number[] = [];

  constructor(clock: Clock, options: ScriptedOptions = {}) {
    this.#clock = clock;
    this.#options = options;
    this.#axisCount = options.axisCount ?? 3;
    this.state = options.startState ?? 'Idle';
    this.#from = options.startAt ?? Array.from({ length: this.#axisCount }, () => 0);
    this.#to = [...this.#from];
  }

  readonly accept = (visitor: Link): void => {
    this.#wire = visitor;
    visitor.received$.subscribe((bytes) => {
      for (const byte of bytes) this.#take(byte);
    });
    const reset = this.#options.resetsOnOpen;
    if (reset) this.powerCycle(reset.bootMs, reset.junk);
    if (this.#options.autoReportMs) this.#autoReport();
  };

  get position(): number[] {
    if (this.#stalledAt) return this.#stalledAt;
    const now = this.#clock.monotonicMs();
    const share =
      this.#endMs > this.#startMs ? Math.min(1, (now - this.#startMs) / (this.#endMs - this.#startMs)) : 1;
    return this.#from.map((from, axis) => from + ((this.#to[axis] ?? from) - from) * share);
  }

  /** Where the shafts truly are: a restart zeroes the counter, not them. */
  get shaft(): number[] {
    return this.position.map((at, axis) => at + (this.#shaftOffset[axis] ?? 0));
  }

  get moving(): boolean {
    return this.#clock.monotonicMs() < this.#endMs;
  }

  say(...texts: string[]): void {
    for (const text of texts) {
      const sent = this.spoil(text);
      if (sent !== undefined) void this.#wire?.write(new TextEncoder().encode(`${sent}\r\n`)).catch(() => {});
    }
  }

  sayRaw(bytes: number[]): void {
    void this.#wire?.write(Uint8Array.from(bytes));
  }

  async hangUp(): Promise<void> {
    await this.#wire?.close();
  }

  /** The supply fails for a moment: everything is forgotten, the banner comes after `bootMs`. */
  powerCycle(bootMs = 30, junk = '', banner = true): void {
    this.#epoch += 1;
    this.restartedUnseen ||= !banner;
    this.#shaftOffset = this.shaft;
    this.#stalledAt = undefined;
    this.mute = false;
    this.#park(this.position.map(() => 0));
    this.#deafUntilMs = this.#clock.monotonicMs() + bootMs;
    this.#after(bootMs, () => {
      this.#inbox = [];
      this.#text = '';
      this.#busy = false;
      this.feed = 0;
      this.plane = 17;
      this.plane = 17;
      this.state = 'Idle';
      if (junk) void this.#wire?.write(new TextEncoder().encode(junk));
      if (banner) this.say('', "Grbl 1.1h ['$' for help]");
    });
  }

  alarm(number: number, muteAfterwards = false): void {
    this.#epoch += 1;
    this.#park(this.position);
    this.state = 'Alarm';
    this.mute = muteAfterwards;
    this.say(`ALARM:${number}`);
  }

  /** The axes stand while the state stays Run. */
  stallMotor(): void {
    this.#stalledAt = this.position;
    this.#endMs = Number.POSITIVE_INFINITY;
  }

  /** A line from another program's queue. */
  sendAsStranger(line: string): void {
    this.#run(line);
  }

  /** Somebody presses hold, or resume, at the machine. */
  press(key: '!' | '~'): void {
    if (key === '!') this.#hold();
    else this.#resume();
  }

  #take(byte: number): void {
    const now = this.#clock.monotonicMs();
    const isUrgent = byte === 0x3f || byte === 0x21 || byte === 0x7e || byte === 0x18 || byte >= 0x80;
    if (isUrgent) this.urgent.push({ byte, ms: now });
    if (now < this.#deafUntilMs) return;
    if (byte === 0x18) this.#softReset();
    else if (this.mute) return;
    else if (byte === 0x3f) this.#report();
    else if (byte === 0x21 && !this.ignoresHold) this.#hold();
    else if (byte === 0x7e) this.#resume();
    else if (byte === 0x0a) this.#lineEnd();
    else if (!isUrgent) this.#text += String.fromCharCode(byte);
  }

  #lineEnd(): void {
    const line = this.#text;
    this.#text = '';
    this.lines.push(line);
    this.#inbox.push(line);
    this.#pump();
  }

  #pump(): void {
    if (this.#busy || this.mute || this.state.startsWith('Hold')) return;
    const line = this.#inbox.shift();
    if (line === undefined) return;
    this.#busy = true;
    this.#after(2, () => this.#run(line));
  }

  #finish(...texts: string[]): void {
    this.say(...texts);
    this.#busy = false;
    this.#pump();
  }

  #run(line: string): void {
    const instead = this.answerInstead(line);
    if (instead) this.#finish(...instead);
    else if (line === '') this.#finish('ok');
    else if (line === '#') this.#finish('error:1');
    else if (line === '$H') this.#home();
    else if (line.startsWith('$')) this.#finish(...this.#dollar(line));
    else if (this.state === 'Alarm') this.#finish('error:9');
    else if (line.startsWith('G4')) this.#dwell();
    else {
      this.feed = Number(/F([\d.]+)/.exec(line)?.[1] ?? this.feed);
      this.plane = Number(/G(1[789])/.exec(line)?.[1] ?? this.plane);
      if (/\bG1\b/.test(line)) this.#start(line);
      this.#finish('ok');
    }
  }

  #dollar(line: string): string[] {
    if (line === '$I')
      return [...(this.#options.identity ?? ['[VER:1.1h.20190830:]', '[OPT:V,15,128]']), 'ok'];
    if (line === '$G') return [`[GC:G1 G54 G${this.plane} G21 G90 G94 M5 M9 T0 F${this.feed} S0]`, 'ok'];
    if (line === '$$') return [...this.#settings(), 'ok'];
    if (line !== '$X') return ['error:3'];
    const locked = this.state === 'Alarm';
    this.state = 'Idle';
    return locked ? ['[MSG:Caution: Unlocked]', 'ok'] : ['ok'];
  }

  #settings(): string[] {
    const perAxis = Array.from({ length: this.#axisCount }, (_, axis) => [
      [100 + axis, '80.000'],
      [110 + axis, '1800.000'],
      [120 + axis, '360.000'],
      [130 + axis, '400.000'],
    ]).flat();
    const all = { ...defaults, ...Object.fromEntries(perAxis), ...this.#options.settings };
    const texts = Object.entries(all).map(([number, value]) => `$${number}=${value}`);
    return this.#options.settingsReversed ? texts.reverse() : texts;
  }

  #home(): void {
    this.state = 'Home';
    const { homedAt, homingMs = 4000 } = this.#options;
    this.#after(homingMs, () => {
      if (homedAt) {
        this.#park(homedAt);
        this.state = 'Idle';
        this.#finish('ok');
        return;
      }
      // The false ok of a failed homing, and the reset behind it.
      this.state = 'Alarm';
      this.say('ALARM:9');
      this.#after(500, () => {
        this.#finish('ok', '', "Grbl 1.1h ['$' for help]", "[MSG:'$H'|'$X' to unlock]");
      });
    });
  }

  #start(line: string): void {
    const from = this.position;
    const to = from.map((at, axis) => {
      const word = new RegExp(`${'XYZABC'[axis]}(-?[\\d.]+)`).exec(line.replace(/G\d+/g, ''));
      return word ? Math.round(Number(word[1]) * 80) / 80 : at;
    });
    const distance = Math.hypot(...to.map((target, axis) => target - (from[axis] ?? 0)));
    this.#from = from;
    this.#to = to;
    this.#startMs = this.#clock.monotonicMs();
    this.#endMs = this.#startMs + (distance / this.feed) * 60_000;
    this.state = distance > 0 ? 'Run' : 'Idle';
    this.#settleIdle();
  }

  #settleIdle(): void {
    if (!Number.isFinite(this.#endMs)) return;
    this.#after(this.#endMs - this.#clock.monotonicMs(), () => {
      // A real timer may come a little early.
      if (this.state === 'Run' && this.#clock.monotonicMs() >= this.#endMs - 5) this.state = 'Idle';
      this.#pump();
    });
  }

  #dwell(): void {
    const wait = (): void => {
      if (this.moving || this.state.startsWith('Hold')) this.#after(10, wait);
      else this.#finish('ok');
    };
    this.#after(10, wait);
  }

  #hold(): void {
    if (this.state === 'Run') {
      const at = this.position;
      this.state = 'Hold:1';
      this.#from = at;
      this.#endMs = this.#clock.monotonicMs();
      const left = this.#to;
      this.#to = at;
      this.#after(120, () => {
        this.state = 'Hold:0';
        this.#leftOver = left;
      });
    } else if (this.state === 'Idle') this.state = 'Hold:0';
  }

  #leftOver: number[] | undefined;

  #resume(): void {
    if (this.state !== 'Hold:0') return;
    this.state = 'Idle';
    const left = this.#leftOver;
    this.#leftOver = undefined;
    if (left) {
      const words = left.map((units, axis) => `${'XYZABC'[axis]}${units}`).join(' ');
      this.#start(`G1 ${words}`);
    }
    this.#pump();
  }

  #softReset(): void {
    const hard = this.state === 'Run' || this.state === 'Hold:1' || this.state === 'Home';
    const wasBusy = this.#busy;
    this.#epoch += 1;
    this.#leftOver = undefined;
    this.#park(this.position);
    this.#stalledAt = undefined;
    this.mute = false;
    this.feed = 0;
    this.plane = 17;
    this.#inbox = [];
    this.#busy = false;
    this.#text = '';
    if (hard) this.say('ALARM:3');
    if (hard && wasBusy) this.say('ok');
    const locked = hard || this.state === 'Alarm';
    this.state = locked ? 'Alarm' : 'Idle';
    this.say('', "Grbl 1.1h ['$' for help]", ...(locked ? ["[MSG:'$H'|'$X' to unlock]"] : []));
    this.#reports = 0;
  }

  #park(at: number[]): void {
    this.#from = [...at];
    this.#to = [...at];
    this.#startMs = 0;
    this.#endMs = 0;
  }

  #report(): void {
    if (this.state === 'Home') return;
    const offset = this.#options.offset ?? this.position.map(() => 0);
    const shown = this.position.map((at, axis) =>
      this.#options.reportsWork ? at - (offset[axis] ?? 0) : at,
    );
    const place = shown.map((at) => at.toFixed(3)).join(',');
    const extra = this.#reports % 10 === 0 ? `|WCO:${offset.map((at) => at.toFixed(3)).join(',')}` : '';
    this.#reports += 1;
    this.say(
      `<${this.state}|${this.#options.reportsWork ? 'WPos' : 'MPos'}:${place}|Bf:15,128|FS:0,0${extra}>`,
    );
  }

  #autoReport(): void {
    const wire = this.#wire;
    this.#clock.at(this.#clock.monotonicMs() + (this.#options.autoReportMs ?? 0), () => {
      if (this.#wire !== wire || !wire?.isOpen) return;
      this.#report();
      this.#autoReport();
    });
  }

  #after(ms: number, act: () => void): void {
    const epoch = this.#epoch;
    this.#clock.at(this.#clock.monotonicMs() + ms, () => {
      if (epoch === this.#epoch) act();
    });
  }
}
