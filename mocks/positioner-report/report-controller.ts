// The simulated motion controller of the family that reports by command: an `ok` for whatever it takes, positions
// that are targets until a barrier has passed, a quick stop without a ramp, and a halt that only its reset button
// ends. Its behaviour is taken from recordings of a real controller; what was not recorded (a quick stop in
// homing) is said where it is done. Motion, queue and mechanics are those of the other family's controller.
import type { Observable } from 'rxjs';
import type { Cancel, Clock } from '../../drivers/clock.ts';
import type { Link } from '../../drivers/link/link.ts';
import type { ControllerOptions } from '../positioner/controller.ts';
import type { ControllerState } from '../positioner/line-runner.ts';
import { Motion } from '../positioner/motion.ts';
import { SerialSide, usualMsPerByte } from '../positioner/serial-side.ts';
import { Settings, stageSettings } from '../positioner/settings.ts';
import type { SimulatedController } from '../positioner/simulated-controller.ts';
import { type AxisLetter, axisLetters, traitsOf } from '../positioner/traits.ts';
import { Voice } from '../positioner/voice.ts';
import type { Pose } from '../scene/pose.ts';
import { LineInput } from './line-input.ts';
import { bootLines, capabilityLines, positionLine, settingLines, softEndLine } from './report-texts.ts';

export interface ReportControllerOptions extends Omit<ControllerOptions, 'edition'> {
  /** Emergency words act in the stream; default true. */
  emergencyParser?: boolean;
  /** `M114 R` tells the true place in motion; default true. */
  truePositions?: boolean;
  /** `ok P15 B3`, and `wait` every second while the queue is empty. */
  chatty?: boolean;
  /** Some releases say `ok` after `Resend:`. */
  okAfterResend?: boolean;
  /** Targets are clipped to 0 to 200 once homed. */
  softEnds?: boolean;
  /** How far a shaft turns when its motor is switched off. */
  driftUnits?: number;
}

const bootTextMs = 25;
const commandMs = 3;
const quickStopMs = 1_020;
const queueLines = 4;
const halted = 'Error:Printer halted. kill() called!';

type Words = ReadonlyMap<string, number | undefined>;

export class PositionReportController implements SimulatedController {
  readonly #clock: Clock;
  readonly #options: ReportControllerOptions;
  readonly #settings: Settings;
  readonly #serial: SerialSide;
  readonly #voice: Voice;
  readonly #motion: Motion;
  readonly #input: LineInput;
  #queue: string[] = [];
  #isRunning = false;
  #deaf: 'boot' | 'halt' | undefined = 'boot';
  #epoch = 0;
  /** Ends the wait of the command that runs, if it waits for motion. */
  #onRest: (() => void) | undefined;
  #isHoming = false;
  #isHomed = false;
  #isAbsolute = true;
  #feed = 25;
  #feedFactor = 1;
  #busySeconds = 2;
  #idleOffSeconds = 120;
  #cancelIdle: Cancel = () => {};
  #offset = [0, 0, 0];
  #stoppedUntilMs = 0;

  constructor(clock: Clock, options: ReportControllerOptions = {}) {
    this.#clock = clock;
    this.#options = options;
    this.#settings = new Settings(traitsOf.classic.axisCount, false, {
      ...stageSettings,
      ...options.settings,
    });
    this.#serial = new SerialSide(clock, options.wireMsPerByte ?? usualMsPerByte, (byte) => this.#take(byte));
    this.#voice = new Voice(clock, this.#serial);
    this.#motion = new Motion(clock, this.#settings, traitsOf.classic, options.mechanics ?? {}, {
      ended: () => this.#motionEnded(),
      struck: () => {},
    });
    this.#input = new LineInput(
      { watchesStream: options.emergencyParser ?? true },
      {
        command: (text) => void this.#queue.push(text),
        refused: (what, last, wanted) => this.#refuse(what, last, wanted),
        emergency: (word) => (word === 'M112' ? this.#halt() : this.#quickStop()),
      },
    );
    this.#powerUp();
  }

  connect(visitor: Link): void {
    this.#serial.connect(visitor);
    if (this.#options.onConnect === 'restarts') this.restart();
  }

  get answered$(): Observable<number> {
    return this.#voice.answered$;
  }

  get state(): ControllerState {
    if (this.#deaf === 'halt') return 'Alarm';
    if (this.#isHoming) return 'Home';
    return this.#motion.planner.isMoving ? 'Run' : 'Idle';
  }

  positionAt(monotonicMs: number): number[] {
    return this.#motion.positionAt(monotonicMs);
  }

  poseAt(monotonicMs: number): Pose {
    return this.#motion.poseAt(monotonicMs);
  }

  shaftAt(monotonicMs: number): number[] {
    return this.#motion.shaftAt(monotonicMs);
  }

  restart(): void {
    this.#motion.stopDead(this.#coastMs);
    this.#powerUp();
  }

  dropVisitors(): Promise<void> {
    return this.#serial.dropAll();
  }

  /** There is no hold in this family: nothing happens. */
  pressHold(): void {}

  loseSteps(axis: AxisLetter, units: number): void {
    this.#motion.loseSteps(axisLetters.indexOf(axis), units);
    this.#lookForEnd();
  }

  stall(axis: AxisLetter, stalled: boolean): void {
    this.#motion.stall(axisLetters.indexOf(axis), stalled);
    this.#lookForEnd();
  }

  /** A disturbance at the very end of a move ends it without a word of its own. */
  #lookForEnd(): void {
    if (this.#motion.planner.queued === 0) this.#motionEnded();
  }

  /** Whatever goes wrong in this family halts it. */
  raiseAlarm(_number: number): void {
    this.#halt();
  }

  loseAnswers(count: number): void {
    this.#voice.loseAnswers(count);
  }

  delayAnswers(count: number, ms: number): void {
    this.#voice.delayAnswers(count, ms);
  }

  damageReports(count: number, damage: (text: string) => string): void {
    this.#voice.damageReports(count, damage);
  }

  /** One character of each of the next lines to it arrives as another. */
  spoilLines(count: number): void {
    this.#input.spoil(count);
  }

  // Lines.

  #take(byte: number): void {
    if (this.#deaf !== undefined) return;
    this.#input.put(byte);
    this.#feedQueue();
  }

  #feedQueue(): void {
    if (this.#deaf !== undefined) return;
    this.#input.take(() => this.#queue.length < queueLines && this.#deaf === undefined);
    this.#runNext();
  }

  #refuse(what: string, last: number, wanted: number): void {
    this.#voice.say(`Error:${what}, Last Line: ${last}`);
    this.#voice.say(`Resend: ${wanted}`);
    if (this.#options.okAfterResend) this.#voice.answer(this.#okText());
  }

  #runNext(): void {
    if (this.#isRunning || this.#queue.length === 0 || this.#deaf !== undefined) return;
    const text = this.#queue[0]!;
    this.#isRunning = true;
    const startedMs = this.#clock.monotonicMs();
    this.#keepSayingBusy(startedMs);
    this.#later(commandMs, () => this.#run(text));
  }

  #keepSayingBusy(startedMs: number): void {
    if (this.#busySeconds === 0) return;
    const epoch = this.#epoch;
    const again = (): void => {
      if (epoch !== this.#epoch || !this.#isRunning || this.#runningSinceMs !== startedMs) return;
      this.#voice.say('echo:busy: processing');
      this.#clock.at(this.#clock.monotonicMs() + this.#busySeconds * 1000, again);
    };
    this.#runningSinceMs = startedMs;
    this.#clock.at(startedMs + this.#busySeconds * 1000, again);
  }

  #runningSinceMs = 0;

  /** The command is done: `ok`, unless a quick stop is still being dealt with. */
  #done(): void {
    const leftMs = this.#stoppedUntilMs - this.#clock.monotonicMs();
    if (leftMs > 0) {
      this.#later(leftMs, () => this.#done());
      return;
    }
    this.#queue.shift();
    this.#isRunning = false;
    this.#voice.answer(this.#okText());
    this.#feedQueue();
  }

  #okText(): string {
    if (!this.#options.chatty) return 'ok';
    const free = traitsOf.classic.plannerBlocks - this.#motion.planner.queued;
    return `ok P${free} B${queueLines - 1 - Math.min(queueLines - 1, this.#queue.length)}`;
  }

  #run(text: string): void {
    const command = /^([GM]\d+)(?: |$|(?=[A-Z]))/.exec(text)?.[1];
    const words = wordsOf(text.slice(command?.length ?? 0));
    if (command === 'G0' || command === 'G1') this.#move(words);
    else if (command === 'M400') this.#atRest(() => this.#done());
    else if (command === 'G4') this.#dwell(words);
    else if (command === 'G28') this.#atRest(() => this.#home());
    else if (command === 'M114' && words.has('D')) this.#atRest(() => this.#tellPosition(false));
    else if (command === 'M114') this.#tellPosition(words.has('R'));
    else {
      this.#runShort(command, text, words);
      this.#done();
    }
  }

  #runShort(command: string | undefined, text: string, words: Words): void {
    const said = this.#answerTo(command, words);
    if (said === undefined) this.#voice.say(`echo:Unknown command: "${text}"`);
    else for (const line of said) this.#voice.say(line);
  }

  /** What a command without waiting says before its `ok`; undefined for an unknown one. */
  #answerTo(command: string | undefined, words: Words): string[] | undefined {
    const s = words.get('S');
    if (command === 'G90') this.#isAbsolute = true;
    else if (command === 'G91') this.#isAbsolute = false;
    else if (command === 'G92') return [this.#setZero(words)];
    else if (command === 'M110') this.#input.setLast(words.get('N') ?? 0);
    else if (command === 'M113') this.#busySeconds = s ?? this.#busySeconds;
    else if (command === 'M115') return capabilityLines(this.#options.emergencyParser ?? true);
    else if (command === 'M18' || command === 'M84') this.#motorsOff(s);
    else if (command === 'M201') this.#store(120, words, 1);
    else if (command === 'M203') this.#store(110, words, 60);
    else if (command === 'M211') return [softEndLine(this.#options.softEnds ?? false)];
    else if (command === 'M220') this.#feedFactor = (s ?? 100) / 100;
    else if (command === 'M503') return settingLines(this.#settings);
    else if (!['G21', 'M17', 'M410', 'M112'].includes(command ?? '')) return undefined;
    return [];
  }

  #store(base: number, words: Words, factor: number): void {
    axisLetters.slice(0, 3).forEach((letter, axis) => {
      const value = words.get(letter);
      if (value !== undefined) this.#settings.store(base + axis, value * factor);
    });
  }

  // Motion.

  #move(words: Words): void {
    if (!this.#motion.hasRoom) {
      this.#onRoom = () => this.#move(words);
      return;
    }
    this.#feed = (words.get('F') ?? this.#feed * 60) / 60;
    const end = this.#motion.planner.endPlace(this.#clock.monotonicMs());
    const target = end.map((value, axis) => this.#targetOf(value, axis, words.get(axisLetters[axis]!)));
    this.#motion.queue({ target, speed: this.#feed * this.#feedFactor, rapid: false });
    if (!this.#motion.planner.isMoving) this.#motion.start();
    this.#cancelIdle();
    if (this.#motion.planner.queued === 0) this.#armIdle();
    this.#done();
  }

  #onRoom: (() => void) | undefined;

  #targetOf(from: number, axis: number, word: number | undefined): number {
    if (word === undefined) return from;
    const target = this.#isAbsolute ? word - this.#offset[axis]! : from + word;
    return this.#options.softEnds && this.#isHomed ? Math.min(200, Math.max(0, target)) : target;
  }

  #setZero(words: Words): string {
    const end = this.#motion.planner.endPlace(this.#clock.monotonicMs());
    axisLetters.slice(0, 3).forEach((letter, axis) => {
      const value = words.get(letter);
      if (value !== undefined) this.#offset[axis] = value - end[axis]!;
    });
    return this.#positionText(end);
  }

  #positionText(place: readonly number[]): string {
    return positionLine(place, this.#offset, this.#settings.perAxis(100, 3));
  }

  #tellPosition(asksForTruth: boolean): void {
    const nowMs = this.#clock.monotonicMs();
    const isTrue = asksForTruth && (this.#options.truePositions ?? true);
    const place = isTrue ? this.#motion.positionAt(nowMs) : this.#motion.planner.endPlace(nowMs);
    this.#voice.report(this.#positionText(place));
    this.#done();
  }

  #dwell(words: Words): void {
    const ms = words.get('P') ?? (words.get('S') ?? 0) * 1000;
    this.#atRest(() => this.#later(ms, () => this.#done()));
  }

  #atRest(act: () => void): void {
    if (this.#motion.planner.queued === 0) act();
    else this.#onRest = act;
  }

  #motionEnded(): void {
    const onRoom = this.#onRoom;
    this.#onRoom = undefined;
    onRoom?.();
    if (this.#motion.planner.queued > 0) return;
    this.#armIdle();
    const onRest = this.#onRest;
    this.#onRest = undefined;
    onRest?.();
  }

  #home(): void {
    this.#isHoming = true;
    const cycle = this.#motion.home();
    this.#later(cycle.endMs - this.#clock.monotonicMs(), () => {
      if (cycle.alarm !== undefined) return this.#halt();
      cycle.counter();
      this.#offset = [0, 0, 0];
      this.#isHoming = false;
      this.#isHomed = true;
      this.#voice.say(this.#positionText(this.#motion.positionAt(this.#clock.monotonicMs())));
      this.#armIdle();
      this.#done();
    });
  }

  get #coastMs(): number {
    return this.#options.coastMs ?? 20;
  }

  /** Pulses end at once; what waits for motion goes on. In homing (not recorded) the search fails: a halt. */
  #quickStop(): void {
    if (this.#isHoming) {
      this.#halt();
      return;
    }
    this.#motion.stopDead(this.#coastMs);
    this.#stoppedUntilMs = this.#clock.monotonicMs() + quickStopMs;
    this.#onRoom = undefined;
    this.#motionEnded();
  }

  #halt(): void {
    if (this.#deaf === 'halt') return;
    this.#motion.stopDead(this.#coastMs);
    this.#forget();
    this.#deaf = 'halt';
    this.#voice.say(halted);
  }

  #motorsOff(seconds: number | undefined): void {
    if (seconds === undefined) this.#letGo();
    else this.#idleOffSeconds = seconds;
    this.#armIdle();
  }

  #armIdle(): void {
    this.#cancelIdle();
    if (this.#idleOffSeconds === 0) return;
    const epoch = this.#epoch;
    this.#cancelIdle = this.#clock.at(this.#clock.monotonicMs() + this.#idleOffSeconds * 1000, () => {
      if (epoch === this.#epoch) this.#letGo();
    });
  }

  /** Without current the wind turns the shaft; the counter knows nothing. */
  #letGo(): void {
    const drift = this.#options.driftUnits ?? 0;
    if (drift !== 0) this.#motion.loseSteps(0, drift);
  }

  // Up and down.

  #powerUp(): void {
    this.#forget();
    this.#input.reset();
    this.#motion.zeroCounter();
    this.#isHomed = false;
    this.#isAbsolute = true;
    this.#feedFactor = 1;
    this.#busySeconds = 2;
    this.#idleOffSeconds = 120;
    this.#offset = [0, 0, 0];
    this.#deaf = 'boot';
    this.#later(this.#options.bootMs ?? bootTextMs, () => {
      for (const line of bootLines(this.#settings)) this.#voice.say(line);
      this.#deaf = undefined;
      this.#armIdle();
      if (this.#options.chatty) this.#sayWait();
    });
  }

  #sayWait(): void {
    this.#later(1_000, () => {
      if (this.#queue.length === 0) this.#voice.say('wait');
      this.#sayWait();
    });
  }

  #forget(): void {
    this.#epoch += 1;
    this.#queue = [];
    this.#isRunning = false;
    this.#onRest = undefined;
    this.#onRoom = undefined;
    this.#isHoming = false;
    this.#stoppedUntilMs = 0;
    this.#cancelIdle();
  }

  /** Like `Clock.at`, but forgotten when the device goes down in between. */
  #later(ms: number, act: () => void): void {
    const epoch = this.#epoch;
    this.#clock.at(this.#clock.monotonicMs() + ms, () => {
      if (epoch === this.#epoch) act();
    });
  }
}

/** Letters and their numbers; a letter without a number counts as given and means nothing. */
function wordsOf(text: string): Words {
  const words = new Map<string, number | undefined>();
  for (const [, letter, number] of text.matchAll(/([A-Z])\s*([-+]?\d*\.?\d*)/g)) {
    words.set(letter!, number === '' || number === undefined ? undefined : Number.parseFloat(number));
  }
  return words;
}
