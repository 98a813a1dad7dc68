// What the instrument's commands work on: settings, sweeps, errors and status behind one small door.
import { ErrorQueue, eventBitOf, Refusal } from './error-queue.ts';
import { presetSettings, type Settings } from './settings.ts';
import { StatusRegisters } from './status-registers.ts';
import type { SweepRunner } from './sweep-runner.ts';

export class InstrumentState {
  readonly identity: string;
  readonly errors = new ErrorQueue();
  readonly status = new StatusRegisters();
  readonly runner: SweepRunner;
  readonly calibrated: boolean;
  #settings: Settings;
  #announcement = 0;

  constructor(identity: string, calibrated: boolean, settings: Settings, runner: SweepRunner) {
    this.identity = identity;
    this.calibrated = calibrated;
    this.#settings = settings;
    this.runner = runner;
  }

  get settings(): Settings {
    return this.#settings;
  }

  change(change: Partial<Settings>): void {
    this.#settings = { ...this.#settings, ...change };
    this.runner.use(this.#settings);
  }

  /** Settings as after preset; what runs is ended. Errors, events and masks stay. */
  reset(): void {
    this.forgetCompletion();
    this.change(presetSettings(this.calibrated));
    this.runner.reset();
  }

  raise(number: number, remark?: string): void {
    this.errors.push(number, remark);
    this.status.setEvent(eventBitOf(number));
  }

  initiate(): void {
    if (this.#settings.continuous || !this.runner.initiate()) throw new Refusal(-213);
    this.status.setOperationEvent(16);
  }

  trigger(): void {
    if (!this.runner.trigger()) throw new Refusal(-211);
  }

  /** Calls `act` when what runs now is done, unless a reset or clear comes first. */
  announceCompletion(act: () => void): void {
    this.#announcement += 1;
    const mine = this.#announcement;
    const done = (): void => {
      if (mine === this.#announcement) act();
    };
    if (this.runner.isSweeping && !this.#settings.continuous) this.runner.whenDone().then(done);
    else if (this.runner.isArmed) this.runner.whenDone().then(done);
    else done();
  }

  forgetCompletion(): void {
    this.#announcement += 1;
  }
}
