// Takes lines out of the receive buffer one at a time and carries them out: reads, waits for room in the
// queue or for motion to end, confirms or refuses. While a line waits nothing behind it is read, which is how
// the buffer comes to overflow. Real-time bytes and alarms are the controller's business.
import type { Clock } from '../../drivers/clock.ts';
import { type DollarOutcome, readDollarLine } from './dollar-lines.ts';
import { type Act, GcodeReader } from './gcode-reader.ts';
import type { Motion } from './motion.ts';
import { ReceiveBuffer, type ReceivedLine } from './receive-buffer.ts';
import type { Settings } from './settings.ts';
import type { ControllerTraits } from './traits.ts';
import { WorkOffsets } from './work-offsets.ts';

export type ControllerState = 'Idle' | 'Run' | 'Hold' | 'Jog' | 'Home' | 'Alarm' | 'Door' | 'Check' | 'Sleep';

/** What the runner needs of the controller around it. */
export interface LineHost {
  state(): ControllerState;
  /** False while held, asleep, deaf or slowing down from a jog. */
  canRead(): boolean;
  later(ms: number, act: () => void): void;
  say(text: string): void;
  answer(text: string): void;
  startSoon(): void;
  startNow(kind: 'Run' | 'Jog'): void;
  pause(): void;
  outsideTravel(): void;
  offsetsChanged(): void;
  /** Carries out what a `$` line asks of the device; true when the device itself gives the answer. */
  perform(kind: 'home' | 'sleep' | 'unlock' | 'check'): number | 'later' | undefined;
  isHomed(): boolean;
}

interface Wait {
  ready: () => boolean;
  proceed: () => void;
  /** The line has been taken from the buffer but nothing of it has been done. */
  notBegun?: boolean;
}

/** Reading and checking a line takes about this long. */
const lineMs = 1.5;
const timeSlackMs = 1e-6;

export class LineRunner {
  readonly #clock: Clock;
  readonly #traits: ControllerTraits;
  readonly #settings: Settings;
  readonly #motion: Motion;
  readonly #host: LineHost;
  readonly buffer: ReceiveBuffer;
  readonly offsets: WorkOffsets;
  readonly reader: GcodeReader;
  readonly #userText = { value: '' };
  readonly #startLines = ['', ''];
  #wait: Wait | undefined;
  #dwellUntilMs: number | undefined;
  #stuckError: number | undefined;

  constructor(clock: Clock, traits: ControllerTraits, settings: Settings, motion: Motion, host: LineHost) {
    this.#clock = clock;
    this.#traits = traits;
    this.#settings = settings;
    this.#motion = motion;
    this.#host = host;
    this.buffer = new ReceiveBuffer(traits.receiveBytes, traits.lineCharacters, traits.joinsCrLf);
    this.offsets = new WorkOffsets(traits.axisCount);
    this.reader = new GcodeReader(traits, this.offsets);
  }

  /** A line has been begun and not yet answered. */
  get isBusy(): boolean {
    return this.#wait !== undefined && this.#wait.notBegun !== true;
  }

  /** While a dwell runs, the moment at which real-time requests are looked at next. */
  nextLookMs(nowMs: number): number {
    if (this.#dwellUntilMs === undefined || this.#dwellUntilMs <= nowMs) return nowMs;
    const tick = this.#traits.dwellTickMs;
    return this.#dwellUntilMs - Math.floor((this.#dwellUntilMs - nowMs) / tick) * tick;
  }

  reset(): void {
    this.#wait = undefined;
    this.#dwellUntilMs = undefined;
    this.#stuckError = undefined;
    this.buffer.clear();
    this.reader.reset();
  }

  /** After a stop on the way: the next move starts from where the axes stand. */
  syncPosition(): void {
    this.reader.position = this.#motion.positionAt(this.#clock.monotonicMs());
  }

  /** A hold of this length is over: a dwell goes on for what it had left. */
  prolong(heldMs: number): void {
    if (this.#dwellUntilMs === undefined) return;
    this.#dwellUntilMs += heldMs;
    this.#host.later(this.#dwellUntilMs - this.#clock.monotonicMs(), () => this.poke());
  }

  /** Something has changed: goes on with the line that waits, or begins the next one. */
  poke(): void {
    if (!this.#host.canRead()) return;
    if (this.#wait) {
      if (!this.#wait.ready()) return;
      const { proceed } = this.#wait;
      this.#wait = undefined;
      proceed();
      return;
    }
    const line = this.buffer.next();
    if (!line) {
      this.#host.startSoon();
      return;
    }
    const readyMs = this.#clock.monotonicMs() + lineMs;
    this.#wait = { ready: this.#reached(readyMs), proceed: () => this.#carryOut(line), notBegun: true };
    this.#host.later(lineMs, () => this.poke());
  }

  #reached(ms: number): () => boolean {
    return () => this.#clock.monotonicMs() >= ms - 1 - timeSlackMs;
  }

  #carryOut(line: ReceivedLine): void {
    if (line.isTooLong) {
      this.#finish(11);
      return;
    }
    const remark = /^\s*\(MSG,(.*)\)\s*$/i.exec(line.raw);
    if (remark && this.#traits.errorsStick) this.#host.say(`[MSG:${remark[1]}]`);
    if (line.text === '') {
      this.#stuckError = undefined;
      this.#finish();
      return;
    }
    if (line.text.startsWith('$')) {
      this.#carryOutDollar(line);
      return;
    }
    if (this.#stuckError !== undefined) {
      this.#finish(this.#stuckError);
      return;
    }
    const state = this.#host.state();
    if (state === 'Alarm' || state === 'Jog') {
      this.#finishGcode(9);
      return;
    }
    const before = this.offsets.total;
    const acts = this.reader.read(line.text);
    if ('error' in acts) {
      this.#finishGcode(acts.error);
      return;
    }
    if (this.offsets.total.some((value, axis) => value !== before[axis])) this.#host.offsetsChanged();
    this.#perform(acts, 0);
  }

  #finish(error?: number): void {
    this.#wait = undefined;
    this.#dwellUntilMs = undefined;
    this.#host.answer(error === undefined ? 'ok' : `error:${error}`);
    this.poke();
  }

  #finishGcode(error: number): void {
    if (this.#traits.errorsStick) this.#stuckError = error;
    this.#finish(error);
  }

  /** Does the acts from `index` on, waiting where one has to; confirms after the last. */
  #perform(acts: readonly Act[], index: number): void {
    const act = acts[index];
    if (!act) {
      this.#finish();
      return;
    }
    const next = (): void => this.#perform(acts, index + 1);
    const isChecking = this.#host.state() === 'Check';
    if (act.kind === 'remark') {
      this.#host.say(`[MSG:${act.text}]`);
      next();
      return;
    }
    if (act.kind === 'move') {
      if (isChecking) {
        this.reader.position = act.target;
        next();
        return;
      }
      this.#move(act, next);
      return;
    }
    if (isChecking) {
      next();
      return;
    }
    this.#whenDrained(() => {
      if (act.kind === 'dwell') return this.#dwell(act.seconds, next);
      if (act.kind === 'pause') {
        this.#host.pause();
        return this.#until(() => true, next);
      }
      next();
    });
  }

  #move(act: Act & { kind: 'move' }, next: () => void): void {
    if (!this.#isWithinTravel(act.target)) {
      // Nothing but a reset leads out of this.
      this.#wait = { ready: () => false, proceed: () => {} };
      this.#host.outsideTravel();
      return;
    }
    const queue = (): void => {
      this.#motion.queue(act);
      this.reader.position = act.target;
      next();
    };
    if (this.#motion.hasRoom) {
      queue();
      return;
    }
    this.#host.startNow('Run');
    this.#until(() => this.#motion.hasRoom, queue);
  }

  #dwell(seconds: number, next: () => void): void {
    const ticks = Math.ceil((seconds * 1000) / this.#traits.dwellTickMs - timeSlackMs);
    const lengthMs = ticks * this.#traits.dwellTickMs;
    this.#dwellUntilMs = this.#clock.monotonicMs() + lengthMs;
    this.#host.later(lengthMs, () => this.poke());
    this.#until(
      () => this.#reached(this.#dwellUntilMs ?? 0)(),
      () => {
        this.#dwellUntilMs = undefined;
        next();
      },
    );
  }

  #whenDrained(then: () => void): void {
    if (this.#motion.planner.queued > 0) this.#host.startNow('Run');
    this.#until(() => this.#motion.planner.queued === 0, then);
  }

  #until(ready: () => boolean, then: () => void): void {
    if (this.#host.canRead() && ready()) {
      then();
      return;
    }
    this.#wait = { ready, proceed: then };
  }

  #isWithinTravel(target: readonly number[]): boolean {
    if (this.#settings.value(20) === 0) return true;
    // The extended edition trusts its limits only once it has been homed.
    if (this.#traits.errorsStick && !this.#host.isHomed()) return true;
    return target.every((value, axis) => value <= 1e-9 && value >= -this.#settings.value(130 + axis) - 1e-9);
  }

  #carryOutDollar(line: ReceivedLine): void {
    this.#stuckError = undefined;
    const stepsBefore = this.#settings.perAxis(100, this.#traits.axisCount);
    const outcome = readDollarLine(line.text, line.raw, {
      state: this.#host.state(),
      extended: this.#traits.hasExtendedBytes,
      settings: this.#settings,
      userText: this.#userText,
      startLines: this.#startLines,
      modeLine: () => this.reader.modeLine(),
      offsetLines: () => this.offsets.lines(),
      versionLines: () => this.#traits.versionLines(this.#userText.value),
    });
    if (outcome.kind === 'error' && this.#traits.errorsStick) this.#stuckError = outcome.number;
    this.#doDollar(outcome, stepsBefore);
  }

  #doDollar(outcome: DollarOutcome, stepsBefore: readonly number[]): void {
    switch (outcome.kind) {
      case 'error':
        this.#finish(outcome.number);
        return;
      case 'print':
        for (const text of outcome.lines) this.#host.say(text);
        this.#finish();
        return;
      case 'stored':
        if (outcome.setting >= 100 && outcome.setting < 110) {
          this.#motion.stepsPerUnitChanged(stepsBefore);
          this.syncPosition();
        }
        this.#finish();
        return;
      case 'jog':
        this.#jog(outcome.text);
        return;
      default: {
        const answer = this.#host.perform(outcome.kind);
        if (answer !== 'later') {
          this.#finish(answer);
          return;
        }
        this.#wait = { ready: () => false, proceed: () => {} };
      }
    }
  }

  /** The device has done what took its time, such as homing: the line that asked for it is confirmed. */
  confirm(): void {
    this.#finish();
  }

  #jog(text: string): void {
    const acts = this.reader.readJog(text);
    if ('error' in acts) {
      this.#finish(acts.error);
      return;
    }
    const act = acts[0];
    if (act?.kind !== 'move') {
      this.#finish();
      return;
    }
    if (!this.#isWithinTravel(act.target)) {
      this.#finish(15);
      return;
    }
    const queue = (): void => {
      this.#motion.queue(act);
      this.reader.position = act.target;
      this.#host.startNow('Jog');
      this.#finish();
    };
    if (this.#motion.hasRoom) {
      queue();
      return;
    }
    this.#until(() => this.#motion.hasRoom, queue);
  }
}
