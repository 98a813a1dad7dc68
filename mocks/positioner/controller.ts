// The simulated motion controller of the family that reports in angle brackets: states, real-time bytes,
// holds, alarms and resets, over the motion and the line runner. Its behaviour is taken from recordings of
// real controllers; its parser and planner are its own, so that a driver cannot be right by sharing a mistake.
import type { Observable } from 'rxjs';
import type { Clock } from '../../drivers/clock.ts';
import type { Link } from '../../drivers/link/link.ts';
import type { Pose } from '../scene/pose.ts';
import { type ControllerState, type LineHost, LineRunner } from './line-runner.ts';
import type { Mechanics } from './mechanics.ts';
import { Motion } from './motion.ts';
import { ReportDesk } from './report-desk.ts';
import { SerialSide, usualMsPerByte } from './serial-side.ts';
import { Settings, stageSettings } from './settings.ts';
import { type AxisLetter, axisLetters, type ControllerTraits, type Edition, traitsOf } from './traits.ts';
import { Voice } from './voice.ts';

export interface ControllerOptions {
  edition?: Edition;
  /** Values of the numbered settings on top of those of the stage. */
  settings?: Readonly<Record<number, number>>;
  mechanics?: Mechanics;
  /** `restarts`: each new visitor resets the device, as a USB bridge with a reset line does. */
  onConnect?: 'goes-on' | 'restarts';
  /** From power-up to the banner; a boot loader makes it longer. Everything received meanwhile is lost. */
  bootMs?: number;
  /** A motor stopped dead runs on for this long at half its speed; the counter does not know. */
  coastMs?: number;
  /** Pace of the serial line; 0 for a controller with native USB. */
  wireMsPerByte?: number;
}

/** How long a soft reset takes until the banner. */
const restartMs = 25;
/** From the last line to the first pulse: in between the state is still idle. */
const startMs = 5;
const lockRemark = "[MSG:'$H'|'$X' to unlock]";

type Deafness = 'boot' | 'restart' | 'silence' | 'critical';

export class RealtimeStatusController {
  readonly #clock: Clock;
  readonly #traits: ControllerTraits;
  readonly #settings: Settings;
  readonly #serial: SerialSide;
  readonly #motion: Motion;
  readonly #runner: LineRunner;
  readonly #voice: Voice;
  readonly #desk: ReportDesk;
  readonly #onConnect: 'goes-on' | 'restarts';
  readonly #bootMs: number;
  readonly #coastMs: number;
  #state: ControllerState = 'Idle';
  #alarm = 0;
  #deaf: Deafness | undefined = 'boot';
  #epoch = 0;
  #resetWanted = false;
  #isCancelling = false;
  #isDoorOpen = false;
  #isHomed = false;
  #heldSinceMs = 0;

  constructor(clock: Clock, options: ControllerOptions = {}) {
    const edition = options.edition ?? 'classic';
    this.#clock = clock;
    this.#traits = traitsOf[edition];
    this.#settings = new Settings(this.#traits.axisCount, edition === 'extended', {
      ...stageSettings,
      ...options.settings,
    });
    this.#onConnect = options.onConnect ?? 'goes-on';
    this.#bootMs = options.bootMs ?? restartMs;
    this.#coastMs = options.coastMs ?? 20;
    this.#serial = new SerialSide(clock, options.wireMsPerByte ?? usualMsPerByte, (b) => this.#take(b));
    this.#voice = new Voice(clock, this.#serial);
    this.#motion = new Motion(clock, this.#settings, this.#traits, options.mechanics ?? {}, {
      ended: () => this.#motionEnded(),
      struck: () => this.#limitStruck(),
    });
    this.#runner = new LineRunner(clock, this.#traits, this.#settings, this.#motion, this.#lineHost());
    const parts = { motion: this.#motion, runner: this.#runner, voice: this.#voice };
    this.#desk = new ReportDesk(clock, this.#traits, this.#settings, parts, {
      state: () => this.#state,
      alarm: () => this.#alarm,
      isDoorOpen: () => this.#isDoorOpen,
      later: (ms, act) => this.#later(ms, act),
    });
    this.#powerUp();
  }

  // What the bench asks and does.

  connect(visitor: Link): void {
    this.#serial.connect(visitor);
    if (this.#onConnect === 'restarts') this.restart();
  }

  /** Counts every `ok` and `error` given, lost ones included. */
  get answered$(): Observable<number> {
    return this.#voice.answered$;
  }

  get state(): ControllerState {
    return this.#state;
  }

  /** Machine coordinates as the controller believes them, at any instant of the clock. */
  positionAt(monotonicMs: number): number[] {
    return this.#motion.positionAt(monotonicMs);
  }

  /** Where the shafts truly stand, at any instant of the clock. */
  poseAt(monotonicMs: number): Pose {
    return this.#motion.poseAt(monotonicMs);
  }

  /** True shaft places in controller units, at any instant of the clock. */
  shaftAt(monotonicMs: number): number[] {
    return this.#motion.shaftAt(monotonicMs);
  }

  /** The reset line or a loss of power: motion ends dead, the counter is zero, the banner follows. */
  restart(): void {
    this.#motion.stopDead(this.#coastMs);
    this.#powerUp();
  }

  /** Closes every visitor's link. */
  dropVisitors(): Promise<void> {
    return this.#serial.dropAll();
  }

  /** Someone presses the hold key on the machine. */
  pressHold(): void {
    this.#feedHold();
  }

  setDoor(open: boolean): void {
    this.#isDoorOpen = open;
    if (open && this.#deaf === undefined) this.#doorOpened();
  }

  /** Forces a limit switch, as a broken cable or a hand would. */
  forceSwitch(axis: AxisLetter, closed: boolean): void {
    this.#motion.forceSwitch(axisLetters.indexOf(axis), closed);
  }

  loseSteps(axis: AxisLetter, units: number): void {
    this.#motion.loseSteps(axisLetters.indexOf(axis), units);
  }

  stall(axis: AxisLetter, stalled: boolean): void {
    this.#motion.stall(axisLetters.indexOf(axis), stalled);
  }

  /** An alarm that needs a reset, such as 1 for a hard limit. */
  raiseAlarm(number: number): void {
    this.#critical(number);
  }

  /** The next answers never reach the wire. */
  loseAnswers(count: number): void {
    this.#voice.loseAnswers(count);
  }

  delayAnswers(count: number, ms: number): void {
    this.#voice.delayAnswers(count, ms);
  }

  damageReports(count: number, damage: (text: string) => string): void {
    this.#voice.damageReports(count, damage);
  }

  // Bytes.

  #take(byte: number): void {
    if (this.#deaf === 'boot') return;
    if (byte === 0x18) {
      this.#softReset();
      return;
    }
    const act = this.#realtimeAct(byte);
    if (act) {
      if (this.#deaf === undefined) act();
      return;
    }
    if (byte > 0x7f) return;
    this.#runner.buffer.put(byte);
    if (this.#deaf === undefined) this.#runner.poke();
  }

  #realtimeAct(byte: number): (() => void) | undefined {
    const extended = this.#traits.hasExtendedBytes;
    if (byte === 0x3f || (extended && byte === 0x80)) return () => this.#desk.want();
    if (byte === 0x7e || (extended && byte === 0x81)) return () => this.#cycleStart();
    if (byte === 0x21 || (extended && byte === 0x82)) return () => this.#feedHold();
    if (byte === 0x84) return () => this.#doorOpened();
    if (byte === 0x85) return () => this.#cancelJog();
    if (byte >= 0x90 && byte <= 0x97) return () => this.#override(byte);
    if (!extended) return undefined;
    if (byte === 0x19) return () => this.#stop();
    if (byte === 0x83) return () => this.#voice.say(this.#runner.reader.modeLine());
    if (byte === 0x87) return () => this.#desk.giveFull();
    if (byte === 0x8c) return () => this.#desk.toggleByItself();
    return undefined;
  }

  #override(byte: number): void {
    const planner = this.#motion.planner;
    const steps: Record<number, number> = { 145: 0.1, 146: -0.1, 147: 0.01, 148: -0.01 };
    if (byte === 0x90) planner.feedFactor = 1;
    else if (byte <= 0x94) {
      planner.feedFactor = Math.min(2, Math.max(0.1, planner.feedFactor + steps[byte]!));
    } else planner.rapidFactor = byte === 0x95 ? 1 : byte === 0x96 ? 0.5 : 0.25;
    this.#desk.reporter.overridesChanged();
    this.#motion.replan();
  }

  // Holding, resuming, stopping.

  get #canRead(): boolean {
    if (this.#deaf !== undefined || this.#isCancelling) return false;
    return this.#state !== 'Hold' && this.#state !== 'Door' && this.#state !== 'Sleep';
  }

  #feedHold(): void {
    if (this.#state === 'Jog') {
      this.#cancelJog();
      return;
    }
    if (this.#state !== 'Idle' && this.#state !== 'Run') return;
    this.#state = 'Hold';
    this.#heldSinceMs = this.#clock.monotonicMs();
    this.#slowDown(() => {});
  }

  #cycleStart(): void {
    if (this.#state === 'Idle') {
      this.#startQueue('Run');
      return;
    }
    const isReady = this.#state === 'Hold' || (this.#state === 'Door' && !this.#isDoorOpen);
    if (!isReady || this.#motion.isSlowing) return;
    this.#state = 'Idle';
    if (this.#traits.remarksResume) this.#voice.say('[MSG:]');
    this.#startQueue('Run');
    this.#runner.prolong(this.#clock.monotonicMs() - this.#heldSinceMs);
    this.#runner.poke();
  }

  #cancelJog(): void {
    if (this.#state !== 'Jog' || this.#isCancelling) return;
    if (this.#traits.hasExtendedBytes) this.#runner.buffer.clearWaiting();
    this.#stopAndForget();
  }

  /** The gentle stop of the extended edition: slow down, forget the queue, no alarm. */
  #stop(): void {
    this.#voice.say('[MSG:Stop]');
    if (this.#state === 'Run' || this.#state === 'Jog' || this.#state === 'Hold') this.#stopAndForget();
  }

  #stopAndForget(): void {
    this.#isCancelling = true;
    this.#slowDown(() => {
      this.#isCancelling = false;
      this.#motion.flush();
      if (this.#state !== 'Door') this.#state = 'Idle';
      this.#runner.syncPosition();
      this.#runner.poke();
    });
  }

  #doorOpened(): void {
    if (this.#state === 'Alarm' || this.#state === 'Sleep' || this.#state === 'Door') return;
    this.#voice.say('[MSG:Check Door]');
    if (this.#state === 'Home') {
      this.#abort(7);
      return;
    }
    this.#heldSinceMs = this.#clock.monotonicMs();
    const wasJog = this.#state === 'Jog';
    this.#state = 'Door';
    if (wasJog) this.#stopAndForget();
    else this.#slowDown(() => {});
  }

  #slowDown(rested: () => void): void {
    const epoch = this.#epoch;
    this.#motion.hold(() => {
      if (epoch === this.#epoch) rested();
    });
  }

  // Starting and ending of motion.

  #startQueue(kind: 'Run' | 'Jog'): void {
    if (this.#motion.planner.queued === 0 || this.#motion.planner.isMoving) return;
    this.#state = kind;
    this.#motion.start();
  }

  #motionEnded(): void {
    const isDone = this.#motion.planner.queued === 0;
    if (isDone && (this.#state === 'Run' || this.#state === 'Jog')) this.#state = 'Idle';
    this.#runner.poke();
  }

  #limitStruck(): void {
    if (this.#state === 'Run' || this.#state === 'Jog' || this.#state === 'Hold') this.#critical(1);
  }

  #home(): 'later' {
    this.#state = 'Home';
    const cycle = this.#motion.home();
    this.#later(cycle.endMs - this.#clock.monotonicMs(), () => {
      if (cycle.alarm !== undefined) return this.#abort(cycle.alarm);
      cycle.counter();
      this.#desk.giveWanted();
      this.#state = 'Idle';
      this.#isHomed = true;
      this.#runner.syncPosition();
      this.#runner.confirm();
    });
    return 'later';
  }

  // Alarms and resets.

  #softReset(): void {
    if (this.#deaf === 'restart') return;
    if (this.#deaf === 'silence') {
      this.#resetWanted = true;
      return;
    }
    const isMoving = this.#motion.planner.isMoving || this.#motion.isSlowing || this.#state === 'Home';
    if (isMoving && this.#deaf === undefined) {
      this.#abort(this.#state === 'Home' ? 6 : 3);
      return;
    }
    this.#motion.flush();
    this.#finishReset();
  }

  /** A reset that finds the axes in motion: pulses end, the alarm is printed, the device goes down. */
  #abort(alarm: number): void {
    this.#motion.stopDead(this.#coastMs);
    this.#enterAlarm(alarm);
    this.#later(this.#traits.alarmSilenceMs, () => this.#finishReset());
  }

  /** An alarm that only a reset ends: nothing is answered until then. */
  #critical(alarm: number): void {
    if (this.#deaf !== undefined) return;
    this.#motion.stopDead(this.#coastMs);
    this.#enterAlarm(alarm);
    this.#later(this.#traits.alarmSilenceMs, () => {
      this.#voice.say('[MSG:Reset to continue]');
      this.#deaf = 'critical';
      if (this.#resetWanted) this.#softReset();
    });
  }

  #enterAlarm(alarm: number): void {
    this.#epoch += 1;
    this.#state = 'Alarm';
    this.#alarm = alarm;
    this.#deaf = 'silence';
    this.#isCancelling = false;
    this.#desk.forget();
    this.#resetWanted = false;
    this.#voice.say(`ALARM:${alarm}`);
  }

  #outsideTravel(): void {
    if (this.#state !== 'Run') {
      this.#critical(2);
      return;
    }
    this.#isCancelling = true;
    this.#slowDown(() => {
      this.#isCancelling = false;
      this.#critical(2);
    });
  }

  #finishReset(): void {
    if (this.#runner.isBusy && this.#traits.confirmsAbortedLine) this.#voice.answer('ok');
    this.#goDown('restart', restartMs);
  }

  #powerUp(): void {
    this.#motion.zeroCounter();
    this.#isHomed = false;
    this.#state = !this.#traits.hasExtendedBytes && this.#settings.value(22) !== 0 ? 'Alarm' : 'Idle';
    this.#desk.powerUp();
    this.#goDown('boot', this.#bootMs);
  }

  #goDown(deaf: Deafness, ms: number): void {
    this.#epoch += 1;
    this.#runner.reset();
    this.#deaf = deaf;
    this.#desk.forget();
    this.#resetWanted = false;
    this.#isCancelling = false;
    this.#later(ms, () => this.#comeUp());
  }

  #comeUp(): void {
    this.#deaf = undefined;
    this.#state = this.#state === 'Alarm' || this.#state === 'Sleep' ? 'Alarm' : 'Idle';
    if (this.#state === 'Idle') this.#alarm = 0;
    this.#motion.planner.feedFactor = 1;
    this.#motion.planner.rapidFactor = 1;
    this.#runner.syncPosition();
    this.#voice.say('');
    this.#voice.say(this.#traits.banner);
    if (this.#mustHome) {
      this.#state = 'Alarm';
      this.#alarm = 11;
      this.#voice.say('ALARM:11');
      this.#later(100, () => this.#voice.say('[MSG:Homing cycle required]'));
    } else if (this.#state === 'Alarm') this.#voice.say(lockRemark);
    this.#desk.comeUp();
    this.#runner.poke();
  }

  /** The extended edition can be set to insist on homing (bit 2 of `$22`). */
  get #mustHome(): boolean {
    return this.#traits.hasExtendedBytes && (this.#settings.value(22) & 4) !== 0 && !this.#isHomed;
  }

  // For the line runner.

  /** Like `Clock.at`, but forgotten when the device goes down in between. */
  #later(ms: number, act: () => void): void {
    const epoch = this.#epoch;
    this.#clock.at(this.#clock.monotonicMs() + ms, () => {
      if (epoch === this.#epoch) act();
    });
  }

  #lineHost(): LineHost {
    return {
      state: () => this.#state,
      canRead: () => this.#canRead,
      later: (ms, act) => this.#later(ms, act),
      say: (text) => this.#voice.say(text),
      answer: (text) => this.#voice.answer(text),
      startSoon: () => {
        if (this.#motion.planner.queued > 0 && this.#state === 'Idle') {
          this.#later(startMs, () => {
            if (this.#state === 'Idle') this.#startQueue('Run');
          });
        }
      },
      startNow: (kind) => this.#startQueue(kind),
      pause: () => this.#feedHold(),
      outsideTravel: () => this.#outsideTravel(),
      offsetsChanged: () => this.#desk.reporter.offsetChanged(),
      perform: (kind) => this.#performDollar(kind),
      isHomed: () => this.#isHomed,
    };
  }

  #performDollar(kind: 'home' | 'sleep' | 'unlock' | 'check'): number | 'later' | undefined {
    if (kind === 'home') return this.#isDoorOpen ? 13 : this.#home();
    if (kind === 'unlock') return this.#unlock();
    if (kind === 'sleep') {
      this.#later(0, () => {
        this.#voice.say('[MSG:Sleeping]');
        this.#state = 'Sleep';
      });
      return undefined;
    }
    const leaves = this.#state === 'Check';
    this.#voice.say(leaves ? '[MSG:Disabled]' : '[MSG:Enabled]');
    if (leaves) this.#later(0, () => this.#softReset());
    else this.#state = 'Check';
    return undefined;
  }

  #unlock(): number | undefined {
    if (this.#state !== 'Alarm') return undefined;
    if (this.#isDoorOpen) return 13;
    if (this.#mustHome) return 46;
    this.#voice.say('[MSG:Caution: Unlocked]');
    this.#state = 'Idle';
    this.#alarm = 0;
    return undefined;
  }
}
