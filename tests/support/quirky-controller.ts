// A controller of the realtime-status family with whatever habits its quirks give it. It knows where its shafts
// really stand, apart from its own counter, which a restart sets to zero; so that a test can tell an arrival
// from a place that is only said to be one.
import type { Clock } from '../../drivers/clock.ts';
import type { Link } from '../../drivers/link/link.ts';
import { type ControllerQuirks, plainController } from './quirky-controller-habits.ts';

interface Motion {
  from: number[];
  to: number[];
  startMs: number;
  endMs: number;
}

type State = 'Idle' | 'Run' | 'Hold' | 'Home' | 'Alarm' | 'Sleep' | 'Boot';

const stepsPerUnit = 80;
const brakeMs = 120;

export class QuirkyController {
  readonly quirks: ControllerQuirks;
  readonly lines: string[] = [];
  /** Largest and smallest place any shaft has been at, in units. */
  readonly extremes = { min: 0, max: 0 };
  visits = 0;
  /** The shafts' places less the counter. */
  #shift: number[];
  #motion: Motion;
  #state: State = 'Idle';
  #braking = false;
  #plane = 17;
  #inbox: string[] = [];
  #text = '';
  #busy = false;
  #sticky: string | undefined;
  #override: number;
  #reports = 0;
  #oks = 0;
  #epoch = 0;
  #visitor: Link | undefined;
  #restMs = 0;
  readonly #clock: Clock;
  readonly #chance: () => number;

  /** `chance`: numbers from 0 to 1, the same for the same seed. */
  constructor(clock: Clock, quirks: Partial<ControllerQuirks> = {}, chance: () => number = () => 0.5) {
    this.#clock = clock;
    this.#chance = chance;
    this.quirks = { ...plainController, ...quirks };
    this.#shift = Array.from({ length: this.quirks.axes }, () => 0);
    const zero = this.#shift.map(() => 0);
    this.#motion = { from: zero, to: zero, startMs: 0, endMs: 0 };
    this.#override = this.quirks.feedOverride;
    if (this.quirks.lockedAtStart) this.#state = 'Alarm';
  }

  readonly accept = (visitor: Link): void => {
    this.visits += 1;
    this.#visitor = visitor;
    visitor.received$.subscribe((bytes) => {
      for (const byte of bytes) if (this.#visitor === visitor) this.#hear(byte);
    });
    if (this.quirks.resetsOnConnect) this.#powerUp(true);
  };

  /** Where the shafts are, in units. */
  get shafts(): number[] {
    return this.#counter().map((units, axis) => units + (this.#shift[axis] ?? 0));
  }

  get moving(): boolean {
    if (this.#state === 'Home') return true;
    const { from, to, endMs } = this.#motion;
    return this.#clock.monotonicMs() < endMs && from.some((units, axis) => units !== to[axis]);
  }

  /** A brown-out: motors stop where they are, the counter is zero. */
  restart(): void {
    this.#powerUp(!this.quirks.bannerLost);
  }

  dropLink(): void {
    void this.#visitor?.close();
  }

  /** Somebody presses hold on the machine. */
  pressHold(): void {
    this.#hold();
  }

  trip(alarm: number): void {
    this.#park();
    this.#epoch += 1;
    this.#state = 'Alarm';
    this.#inbox = [];
    this.#busy = false;
    this.#say(`ALARM:${alarm}`);
  }

  #counter(): number[] {
    const { from, to, startMs, endMs } = this.#motion;
    const nowMs = this.#clock.monotonicMs();
    const share = endMs > startMs ? Math.min(1, Math.max(0, (nowMs - startMs) / (endMs - startMs))) : 1;
    return from.map((units, axis) => {
      const target = to[axis] ?? units;
      return share >= 1
        ? target
        : Math.round((units + (target - units) * share) * stepsPerUnit) / stepsPerUnit;
    });
  }

  #park(): void {
    const at = this.#counter();
    this.#motion = { from: at, to: at, startMs: 0, endMs: 0 };
    this.#restMs = this.#clock.monotonicMs();
    for (const units of this.shafts) {
      this.extremes.min = Math.min(this.extremes.min, units);
      this.extremes.max = Math.max(this.extremes.max, units);
    }
  }

  #powerUp(tells: boolean): void {
    const shafts = this.shafts;
    this.#park();
    this.#epoch += 1;
    this.#shift = shafts;
    const zero = shafts.map(() => 0);
    this.#motion = { from: zero, to: zero, startMs: 0, endMs: 0 };
    this.#override = this.quirks.feedOverride;
    this.#forget();
    this.#state = 'Boot';
    this.#after(this.quirks.bootMs, () => {
      this.#state = this.quirks.lockedAtStart ? 'Alarm' : 'Idle';
      this.#text = '';
      if (tells) this.#say(...this.quirks.bootText, '', this.quirks.banner, ...this.#lockRemark());
    });
  }

  #lockRemark(): string[] {
    return this.#state === 'Alarm' ? ["[MSG:'$H'|'$X' to unlock]"] : [];
  }

  #forget(): void {
    this.#plane = 17;
    this.#inbox = [];
    this.#text = '';
    this.#busy = false;
    this.#braking = false;
    this.#sticky = undefined;
    this.#reports = 0;
  }

  #hear(byte: number): void {
    if (byte === 0x18) this.#softReset();
    else if (this.#state === 'Boot') return;
    else if (byte === 0x3f) this.#report();
    else if (byte === 0x21) this.#after(this.quirks.holdLateMs, () => this.#hold());
    else if (byte === 0x7e) this.#resume();
    else if (byte === 0x90) this.#override = this.quirks.overrideFixed ? this.#override : 100;
    else if (byte === 0x0a) {
      this.#inbox.push(this.#text.trim());
      this.#text = '';
      this.#pump();
    } else if (byte < 0x80 && byte !== 0x0d) this.#text += String.fromCharCode(byte);
  }

  #pump(): void {
    if (this.#busy || this.#state === 'Hold') return;
    const line = this.#inbox.shift();
    if (line === undefined) return;
    this.#busy = true;
    this.lines.push(line);
    this.#run(line);
  }

  /** The line is answered; the next may come. */
  #answer(...texts: string[]): void {
    this.#oks += 1;
    const { slowOkEvery, slowOkMs, okDelayMs, lostOks } = this.quirks;
    const slow = slowOkEvery > 0 && this.#oks % slowOkEvery === 0;
    this.#after(slow ? slowOkMs : okDelayMs, () => {
      this.#busy = false;
      const lost = this.#chance() < lostOks;
      this.#say(...(lost ? texts.slice(0, -1) : texts));
      this.#pump();
    });
  }

  #run(line: string): void {
    if (line === '' || line.startsWith('$')) {
      this.#sticky = undefined;
      if (line === '') this.#answer('ok');
      else this.#dollar(line);
      return;
    }
    const refusal = this.#refusalOf(line);
    if (refusal !== undefined) {
      if (this.quirks.stickyErrors) this.#sticky = refusal;
      this.#answer(refusal);
      return;
    }
    this.#plane = Number(/G(17|18|19)\b/.exec(line)?.[1] ?? this.#plane);
    if (/^G4\b/.test(line)) this.#dwell();
    else if (/\bG1\b/.test(line)) this.#move(line);
    else this.#answer('ok');
  }

  #refusalOf(line: string): string | undefined {
    if (this.#sticky !== undefined) return this.#sticky;
    if (!/^[A-Z]/.test(line)) return 'error:1';
    if (this.#state === 'Alarm' || this.#state === 'Sleep') return 'error:9';
    return /^(?:[A-Z]-?[\d.]+\s*)+$/.test(line) ? undefined : 'error:2';
  }

  #dollar(line: string): void {
    if (line === '$I') this.#answer(this.quirks.version, '[OPT:V,15,128]', 'ok');
    else if (line === '$$') this.#answer(...this.#settings(), 'ok');
    else if (line === '$H') this.#home();
    else if (line === '$X') {
      const locked = this.#state === 'Alarm';
      if (locked) this.#state = 'Idle';
      this.#answer(...(locked ? ['[MSG:Caution: Unlocked]'] : []), 'ok');
    } else if (line === '$G') {
      const state = `[GC:G1 G54 G${this.#plane} G21 G90 G94 M5 M9 T0 F0 S0]`;
      this.#answer(...(this.quirks.printsState ? [state] : []), 'ok');
    } else this.#answer('error:3');
  }

  #settings(): string[] {
    const perAxis = Array.from({ length: this.quirks.axes }, (_, axis) => [
      [100 + axis, `${stepsPerUnit}.000`],
      [110 + axis, '1200.000'],
      [120 + axis, '200.000'],
      [130 + axis, '400.000'],
    ]).flat();
    const plain = { 0: '10', 1: '255', 3: '0', 10: '1', 13: '0', 20: '0', 22: '0', 25: '2000.000', 32: '0' };
    const all = Object.entries({ ...plain, ...Object.fromEntries(perAxis), ...this.quirks.settings });
    const texts = all.map(
      ([n, value]) => `$${n}=${value}${this.quirks.settingComments ? ' (a remark, unit)' : ''}`,
    );
    if (this.quirks.settingsOrder === 'down') return texts.reverse();
    const mixed = (text: string): number => (Number(/\d+/.exec(text)?.[0]) * 37) % 101;
    return this.quirks.settingsOrder === 'mixed' ? texts.sort((a, b) => mixed(a) - mixed(b)) : texts;
  }

  #home(): void {
    if (this.quirks.settings[22] !== '1') {
      this.#answer('error:5');
      return;
    }
    this.#state = 'Home';
    this.#after(this.quirks.homingMs, () => {
      this.#forget();
      if (this.quirks.homingFails) {
        this.#state = 'Alarm';
        this.#say('ALARM:9', 'ok', '', this.quirks.banner, ...this.#lockRemark());
        return;
      }
      this.#state = 'Idle';
      // The switches stand at zero of the shafts, and become zero of the counter.
      this.#shift = this.#shift.map(() => 0);
      const zero = this.#shift.map(() => 0);
      this.#motion = { from: zero, to: zero, startMs: 0, endMs: 0 };
      this.#restMs = this.#clock.monotonicMs();
      this.#answer('ok');
    });
  }

  #move(line: string): void {
    const from = this.#counter();
    const words = line.replace(/G\d+(\.\d+)?/g, '');
    const feed = Number(/F([\d.]+)/.exec(words)?.[1] ?? 1);
    const to = from.map((units, axis) => {
      const word = new RegExp(`${'XYZABC'[axis]}(-?[\\d.]+)`).exec(words);
      return word ? Math.round(Number(word[1]) * stepsPerUnit) / stepsPerUnit : units;
    });
    const begin = (): void => {
      if (to.some((units) => Math.abs(units) > this.quirks.softLimit)) this.trip(2);
      else {
        this.#begin(to, feed);
        this.#answer('ok');
      }
    };
    if (this.moving) this.#after(this.#motion.endMs - this.#clock.monotonicMs(), begin);
    else begin();
  }

  #begin(to: number[], feed: number): void {
    this.#park();
    const from = this.#motion.from;
    const distance = Math.hypot(...to.map((units, axis) => units - (from[axis] ?? 0)));
    const nowMs = this.#clock.monotonicMs();
    const endMs = nowMs + (distance / Math.min(feed, 1200)) * 60_000 * (100 / this.#override);
    this.#motion = { from, to, startMs: nowMs, endMs };
    this.#state = distance > 0 ? 'Run' : 'Idle';
    this.#after(endMs - nowMs, () => {
      if (this.#state !== 'Run') return;
      this.#park();
      this.#state = 'Idle';
    });
  }

  #dwell(): void {
    const wait = (): void => {
      if (this.moving || this.#state === 'Hold') this.#after(10, wait);
      else this.#answer('ok');
    };
    this.#after(10, wait);
  }

  #hold(): void {
    if (this.#state === 'Run') {
      const nowMs = this.#clock.monotonicMs();
      if (nowMs - this.#motion.startMs < this.quirks.holdDeafMs) return;
      const { from, to, startMs, endMs } = this.#motion;
      // The ramp: as far again as half of what the rate would cover meanwhile.
      const stopMs = Math.min(endMs, nowMs + brakeMs / 2);
      const share = (stopMs - startMs) / (endMs - startMs);
      const at = this.#counter();
      const rest = from.map((units, axis) => {
        const units2 = units + ((to[axis] ?? units) - units) * share;
        return Math.round(units2 * stepsPerUnit) / stepsPerUnit;
      });
      this.#motion = { from: at, to: rest, startMs: nowMs, endMs: nowMs + brakeMs };
      this.#state = 'Hold';
      this.#braking = true;
      const epoch = this.#epoch;
      this.#after(brakeMs, () => {
        if (epoch === this.#epoch) this.#park();
        this.#braking = false;
      });
    } else if (this.#state === 'Idle') this.#state = 'Hold';
  }

  #resume(): void {
    if (this.#state !== 'Hold' || this.#braking) return;
    this.#state = 'Idle';
    this.#pump();
  }

  #softReset(): void {
    if (this.#state === 'Boot') return;
    const inMotion = this.moving || this.#state === 'Home';
    const { resetAlarm } = this.quirks;
    const alarms = resetAlarm === 'always' || (resetAlarm === 'in-motion' && inMotion);
    const wasBusy = this.#busy;
    const locked = alarms || this.#state === 'Alarm';
    this.#park();
    this.#epoch += 1;
    this.#forget();
    this.#state = 'Boot';
    if (alarms) this.#say('ALARM:3', ...(wasBusy ? ['ok'] : []));
    this.#after(20, () => {
      this.#state = locked ? 'Alarm' : 'Idle';
      if (!this.quirks.resetsSilently) this.#say('', this.quirks.banner, ...this.#lockRemark());
    });
  }

  #report(): void {
    const { lostReports, sleepsAfterMs, offset, offsetEvery, reports, fields, positionLast } = this.quirks;
    if (this.#state === 'Home' || this.#chance() < lostReports) return;
    const restedMs = this.#clock.monotonicMs() - this.#restMs;
    if (this.#state === 'Idle' && sleepsAfterMs > 0 && restedMs > sleepsAfterMs) this.#state = 'Sleep';
    const shown = this.#counter().map((units) => units - (reports === 'work' ? offset : 0));
    const place = `${reports === 'work' ? 'WPos' : 'MPos'}:${shown.map((units) => units.toFixed(3)).join(',')}`;
    const withOffset = this.#reports % offsetEvery === 0 && reports === 'work';
    const offsets = withOffset ? [`WCO:${shown.map(() => offset.toFixed(3)).join(',')}`] : [];
    this.#reports += 1;
    const parts = positionLast ? [...offsets, ...fields, place] : [place, ...fields, ...offsets];
    this.#say(`<${[this.#stateWord(), ...parts].join('|')}>`);
  }

  #stateWord(): string {
    if (this.#state === 'Idle') return this.quirks.idleWord;
    if (this.#state === 'Hold') return this.quirks.plainHold ? 'Hold' : `Hold:${this.#braking ? 1 : 0}`;
    return this.#state;
  }

  #say(...texts: string[]): void {
    const { lineEnd, remarks, noise, noiseBytes } = this.quirks;
    for (const text of texts) {
      if (!this.#visitor?.isOpen) return;
      if (this.#chance() < remarks) this.#write(`[MSG:Remark ${this.lines.length}]${lineEnd}`);
      let line = `${text}${lineEnd}`;
      if (this.#chance() < noise) {
        const at = Math.floor(this.#chance() * line.length);
        const byte =
          Math.floor(this.#chance() * (noiseBytes === 'any' ? 256 : 128)) + (noiseBytes === 'any' ? 0 : 128);
        line = `${line.slice(0, at)}${String.fromCharCode(byte)}${line.slice(at)}`;
      }
      this.#write(line);
    }
  }

  #write(line: string): void {
    this.#visitor?.write(Buffer.from(line, 'latin1')).catch(() => {});
  }

  #after(ms: number, act: () => void): void {
    const epoch = this.#epoch;
    this.#clock.at(this.#clock.monotonicMs() + ms, () => {
      if (epoch === this.#epoch) act();
    });
  }
}
