// The moving half of the simulated controller: queue, timeline and stage together, with the few events that
// motion itself causes (a move has ended, a hold has come to rest, a switch has closed). The other half reads
// lines and real-time bytes and asks this one; nothing here speaks on the wire.
import type { Cancel, Clock } from '../../drivers/clock.ts';
import type { Pose } from '../scene/pose.ts';
import { homeAxis } from './homing.ts';
import { type Mechanics, Stage } from './mechanics.ts';
import { type Move, Planner } from './planner.ts';
import type { Settings } from './settings.ts';
import { Timeline } from './timeline.ts';
import type { ControllerTraits } from './traits.ts';

export interface MotionEvents {
  /** Moves have left the queue; perhaps it is empty now. */
  ended: () => void;
  /** A hard-limit switch has closed in motion (only with `$21`). */
  struck: () => void;
}

export class Motion {
  readonly #clock: Clock;
  readonly #settings: Settings;
  readonly #traits: ControllerTraits;
  readonly #events: MotionEvents;
  readonly #stage: Stage;
  readonly #timeline: Timeline;
  readonly planner: Planner;
  readonly #forced = new Set<number>();
  readonly #stalled = new Set<number>();
  #stopMs = 0;
  #cancelEnd: Cancel = () => {};
  #cancelStrike: Cancel = () => {};

  constructor(
    clock: Clock,
    settings: Settings,
    traits: ControllerTraits,
    mechanics: Mechanics,
    events: MotionEvents,
  ) {
    this.#clock = clock;
    this.#settings = settings;
    this.#traits = traits;
    this.#events = events;
    this.#stage = new Stage(traits.axisCount, mechanics);
    this.#timeline = new Timeline(this.#stage.play, this.#stage.start);
    this.planner = new Planner(this.#timeline, () => ({
      rate: settings.perAxis(110, traits.axisCount).map((perMinute) => perMinute / 60),
      acceleration: settings.perAxis(120, traits.axisCount),
    }));
    this.#refreshFollow();
  }

  /** Machine coordinates of each axis, on whole steps, at any instant. */
  positionAt(ms: number): number[] {
    return this.onSteps(this.#timeline.placesAt(ms).counter);
  }

  shaftAt(ms: number): number[] {
    return this.#timeline.placesAt(ms).shaft;
  }

  poseAt(ms: number): Pose {
    return this.#stage.pose(this.shaftAt(ms));
  }

  speedAt(ms: number): number {
    return this.#timeline.speedAt(ms);
  }

  /** The nearest whole steps. */
  onSteps(units: readonly number[]): number[] {
    const perUnit = this.#settings.perAxis(100, this.#traits.axisCount);
    return units.map((value, axis) => Math.round(value * perUnit[axis]!) / perUnit[axis]!);
  }

  get hasRoom(): boolean {
    return this.planner.queued < this.#traits.plannerBlocks;
  }

  get isSlowing(): boolean {
    return this.#clock.monotonicMs() < this.#stopMs - 1e-6;
  }

  queue(move: Move): void {
    this.planner.add({ ...move, target: this.onSteps(move.target) }, this.#clock.monotonicMs());
    this.#watch();
  }

  start(): void {
    this.planner.start(this.#clock.monotonicMs());
    this.#watch();
  }

  /** Slows down along the path; calls `rested` when the axes stand. */
  hold(rested: () => void): void {
    const { stopMs } = this.planner.hold(this.#clock.monotonicMs());
    this.#stopMs = stopMs;
    this.#watch();
    this.#clock.at(stopMs, rested);
  }

  /** Empties the queue at rest. */
  flush(): void {
    const nowMs = this.#clock.monotonicMs();
    this.planner.abandon(nowMs);
    this.#timeline.settleCounter(nowMs, this.positionAt(nowMs));
    this.#watch();
  }

  /** No more pulses at once: the counter stops, the motor runs on for `coastMs` at half its speed. */
  stopDead(coastMs: number): void {
    const nowMs = this.#clock.monotonicMs();
    const lost = this.planner.abandon(nowMs);
    this.#timeline.settleCounter(nowMs, this.positionAt(nowMs));
    lost.forEach((speed, axis) => {
      if (speed !== 0) this.#timeline.slip(nowMs, axis, (speed * coastMs) / 2000);
    });
    this.#stopMs = nowMs;
    this.#watch();
  }

  /** Power-up: the counter begins at zero wherever the shaft stands. */
  zeroCounter(): void {
    this.#timeline.settleCounter(
      this.#clock.monotonicMs(),
      this.#stage.play.map(() => 0),
    );
  }

  /** After a steps-per-unit setting was written: the same steps now mean another place. */
  stepsPerUnitChanged(before: readonly number[]): void {
    const nowMs = this.#clock.monotonicMs();
    const after = this.#settings.perAxis(100, this.#traits.axisCount);
    const counter = this.#timeline.placesAt(nowMs).counter;
    this.#timeline.settleCounter(
      nowMs,
      counter.map((value, axis) => (value * before[axis]!) / after[axis]!),
    );
    this.#refreshFollow();
  }

  /** Overrides have changed: the queue is planned anew. */
  replan(): void {
    if (this.planner.isMoving) this.planner.replan(this.#clock.monotonicMs());
    this.#watch();
  }

  /** Lays the whole homing cycle into the timeline; tells when it ends and with which alarm, if any. */
  home(): { endMs: number; alarm: number | undefined; counter: () => void } {
    let atMs = this.#clock.monotonicMs();
    for (const axis of this.#stage.switched) {
      const side = this.#sideOf(axis);
      const outcome = homeAxis(this.#timeline, this.#settings, axis, side, atMs, (shaft) =>
        this.#stage.isClosed(axis, shaft, side),
      );
      atMs = outcome.endMs;
      if (outcome.alarm !== undefined) return { ...outcome, counter: () => {} };
    }
    const alarm = this.#stage.switched.length === 0 ? 9 : undefined;
    return { endMs: atMs, alarm, counter: () => this.#settleHomed(atMs) };
  }

  /** Letters of the switches that are closed now. */
  closedSwitches(): number[] {
    const shaft = this.shaftAt(this.#clock.monotonicMs());
    return shaft.flatMap((value, axis) =>
      this.#forced.has(axis) || this.#stage.isClosed(axis, value, this.#sideOf(axis)) ? [axis] : [],
    );
  }

  forceSwitch(axis: number, closed: boolean): void {
    if (closed) this.#forced.add(axis);
    else this.#forced.delete(axis);
    if (closed && this.#settings.value(21) !== 0) this.#events.struck();
  }

  /** Lost steps: the motor stands elsewhere by `units`, the counter knows nothing. */
  loseSteps(axis: number, units: number): void {
    const nowMs = this.#clock.monotonicMs();
    this.planner.disturb(nowMs, () => this.#timeline.slip(nowMs, axis, units));
    this.#watch();
  }

  /** A stalled motor hums in its place while the counter goes on. */
  stall(axis: number, stalled: boolean): void {
    if (stalled) this.#stalled.add(axis);
    else this.#stalled.delete(axis);
    this.planner.disturb(this.#clock.monotonicMs(), () => this.#refreshFollow());
    this.#watch();
  }

  #sideOf(axis: number): 1 | -1 {
    return (this.#settings.value(23) >> axis) & 1 ? -1 : 1;
  }

  #settleHomed(atMs: number): void {
    const pullOff = this.#settings.value(27);
    const counter = [...this.#timeline.placesAt(atMs).counter];
    for (const axis of this.#stage.switched) {
      counter[axis] = this.#sideOf(axis) === 1 ? -pullOff : pullOff - this.#settings.value(130 + axis);
    }
    this.#timeline.settleCounter(atMs, this.onSteps(counter));
  }

  #refreshFollow(): void {
    const follow = this.#stage.follow(this.#settings.perAxis(100, this.#traits.axisCount));
    follow.forEach((value, axis) => {
      this.#timeline.follow[axis] = this.#stalled.has(axis) ? 0 : value;
    });
  }

  /** Sets the two timers anew: the end of the move under way, and the closing of a hard limit. */
  #watch(): void {
    this.#cancelEnd();
    this.#cancelStrike();
    const endMs = this.planner.nextEndMs;
    if (endMs !== undefined) {
      this.#cancelEnd = this.#clock.at(endMs, () => {
        const changed = this.planner.advance(this.#clock.monotonicMs());
        this.#watch();
        if (changed) this.#events.ended();
      });
    }
    if (this.#settings.value(21) === 0 || !this.planner.isMoving) return;
    const nowMs = this.#clock.monotonicMs();
    const closed = new Set(this.closedSwitches());
    const strikeMs = this.#timeline.firstWhen(nowMs, ({ shaft }) =>
      shaft.some((value, axis) => !closed.has(axis) && this.#stage.isClosed(axis, value, this.#sideOf(axis))),
    );
    if (strikeMs !== undefined) this.#cancelStrike = this.#clock.at(strikeMs, () => this.#events.struck());
  }
}
