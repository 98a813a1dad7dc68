// When the simulated controller reports: on request, by itself, or once at the end of homing; and what it
// finds to report. How a report is written is in status-report.ts.
import type { Clock } from '../../drivers/clock.ts';
import type { ControllerState, LineRunner } from './line-runner.ts';
import type { Motion } from './motion.ts';
import type { Settings } from './settings.ts';
import { type ReportFacts, StatusReporter } from './status-report.ts';
import type { ControllerTraits } from './traits.ts';
import type { Voice } from './voice.ts';

/** What the desk asks of the controller. */
export interface DeskHost {
  state: () => ControllerState;
  alarm: () => number;
  isDoorOpen: () => boolean;
  /** Forgotten when the device goes down in between. */
  later: (ms: number, act: () => void) => void;
}

/** From a status request to the report's first byte. */
const noticeMs = 1;

export class ReportDesk {
  readonly reporter: StatusReporter;
  readonly #clock: Clock;
  readonly #traits: ControllerTraits;
  readonly #settings: Settings;
  readonly #motion: Motion;
  readonly #runner: LineRunner;
  readonly #voice: Voice;
  readonly #host: DeskHost;
  #isWanted = false;
  #byItselfMs = 0;

  constructor(
    clock: Clock,
    traits: ControllerTraits,
    settings: Settings,
    parts: { motion: Motion; runner: LineRunner; voice: Voice },
    host: DeskHost,
  ) {
    this.#clock = clock;
    this.#traits = traits;
    this.#settings = settings;
    this.#motion = parts.motion;
    this.#runner = parts.runner;
    this.#voice = parts.voice;
    this.#host = host;
    this.reporter = new StatusReporter(traits.hasExtendedBytes);
  }

  /** Requests not yet answered are forgotten when the device goes down. */
  forget(): void {
    this.#isWanted = false;
  }

  /** The interval of reports by itself is taken from the settings at power-up only. */
  powerUp(): void {
    this.#byItselfMs = this.#traits.hasExtendedBytes ? this.#settings.value(481) : 0;
  }

  comeUp(): void {
    this.reporter.reset();
    this.#reportByItself();
  }

  want(): void {
    if (this.#isWanted) return;
    this.#isWanted = true;
    if (this.#host.state() === 'Home') return;
    const nowMs = this.#clock.monotonicMs();
    this.#host.later(this.#runner.nextLookMs(nowMs) - nowMs + noticeMs, () => {
      if (this.#host.state() !== 'Home') this.giveWanted();
    });
  }

  /** Answers a request that has been waiting. */
  giveWanted(): void {
    if (this.#isWanted) this.#give();
  }

  giveFull(): void {
    const facts = this.#facts();
    if (this.#host.state() === 'Alarm') facts.state = `Alarm:${this.#host.alarm()}`;
    const system = `G${54 + this.#runner.offsets.selected}`;
    this.#voice.say(this.reporter.renderFull(facts, system, this.#byItselfMs));
  }

  toggleByItself(): void {
    this.#byItselfMs = this.#byItselfMs > 0 ? 0 : this.#settings.value(481);
    this.#reportByItself();
  }

  #reportByItself(): void {
    const everyMs = this.#byItselfMs;
    if (everyMs <= 0) return;
    this.#host.later(everyMs, () => {
      if (this.#byItselfMs !== everyMs) return;
      if (this.#host.state() !== 'Home') this.#give();
      this.#reportByItself();
    });
  }

  #give(): void {
    this.#isWanted = false;
    this.#voice.report(this.reporter.render(this.#facts()));
  }

  #facts(): ReportFacts {
    const nowMs = this.#clock.monotonicMs();
    const { feedFactor, rapidFactor, queued } = this.#motion.planner;
    return {
      state: this.#stateText(),
      position: this.#motion.positionAt(nowMs),
      offset: this.#runner.offsets.total,
      feed: this.#motion.speedAt(nowMs) * 60,
      freeBlocks: this.#traits.plannerBlocks - queued,
      freeBytes: this.#runner.buffer.free - (this.#traits.hasExtendedBytes ? 1 : 0),
      closedSwitches: this.#motion.closedSwitches(),
      doorOpen: this.#host.isDoorOpen(),
      overrides: [Math.round(feedFactor * 100), Math.round(rapidFactor * 100), 100],
      mask: this.#settings.value(10),
      inches: this.#settings.value(13) !== 0,
      busy: !['Idle', 'Alarm', 'Check', 'Sleep'].includes(this.#host.state()),
    };
  }

  #stateText(): string {
    const { isSlowing } = this.#motion;
    const state = this.#host.state();
    if (state === 'Hold') return isSlowing ? 'Hold:1' : 'Hold:0';
    if (state !== 'Door') return state;
    return isSlowing ? 'Door:2' : this.#host.isDoorOpen() ? 'Door:1' : 'Door:0';
  }
}
