// The queue of straight moves and the look-ahead over it: with which speed each one begins and ends, so that
// the whole queue can always be brought to rest within what is queued. Moves in one line run through at
// speed; at every corner the axes stop. Motion itself is written into the timeline, so that nothing here
// needs to tick: the controller asks when the next move ends.
import { phasesOf, ramp } from './speed-profile.ts';
import type { Timeline } from './timeline.ts';

export interface Move {
  /** Target of each axis in controller units, already on a whole step. */
  target: readonly number[];
  /** Units per second along the path before overrides. */
  speed: number;
  rapid: boolean;
}

interface Block {
  from: readonly number[];
  target: readonly number[];
  unit: readonly number[];
  length: number;
  speed: number;
  rapid: boolean;
  acceleration: number;
  topSpeed: number;
  /** Runs straight on from the block before it. */
  joins: boolean;
}

export interface AxisLimits {
  /** Units per second. */
  rate: readonly number[];
  /** Units per second squared. */
  acceleration: readonly number[];
}

const sameDirection = 0.999999;

export class Planner {
  readonly #timeline: Timeline;
  readonly #limits: () => AxisLimits;
  #blocks: Block[] = [];
  #ends: number[] = [];
  #moving = false;
  feedFactor = 1;
  rapidFactor = 1;

  constructor(timeline: Timeline, limits: () => AxisLimits) {
    this.#timeline = timeline;
    this.#limits = limits;
  }

  get queued(): number {
    return this.#blocks.length;
  }

  /** Motion has been started and neither finished nor been held. */
  get isMoving(): boolean {
    return this.#moving;
  }

  /** When the move under way ends; undefined when nothing is under way. */
  get nextEndMs(): number | undefined {
    return this.#ends[0];
  }

  /** Where the axes will stand when everything queued is done. */
  endPlace(nowMs: number): readonly number[] {
    return this.#blocks.at(-1)?.target ?? this.#timeline.placesAt(nowMs).counter;
  }

  /** Queues a move; false when it has no length. */
  add(move: Move, nowMs: number): boolean {
    const from = this.endPlace(nowMs);
    const way = move.target.map((value, axis) => value - from[axis]!);
    const length = Math.hypot(...way);
    if (length < 1e-9) return false;
    const unit = way.map((value) => value / length);
    const limits = this.#limits();
    const before = this.#blocks.at(-1);
    this.#blocks.push({
      from,
      target: move.target,
      unit,
      length,
      speed: move.speed,
      rapid: move.rapid,
      acceleration: alongPath(unit, limits.acceleration),
      topSpeed: alongPath(unit, limits.rate),
      joins: before !== undefined && dot(before.unit, unit) > sameDirection,
    });
    if (this.#moving) this.replan(nowMs);
    return true;
  }

  start(nowMs: number): void {
    if (this.#blocks.length === 0) return;
    this.#moving = true;
    this.replan(nowMs);
  }

  /** Takes finished moves off the queue; true when something changed. */
  advance(nowMs: number): boolean {
    let changed = false;
    while (this.#ends.length > 0 && this.#ends[0]! <= nowMs + 1e-6) {
      this.#ends.shift();
      this.#blocks.shift();
      changed = true;
    }
    if (changed && this.#ends.length === 0) this.#moving = false;
    return changed;
  }

  /** Slows down to rest along the path, keeping the queue. Returns when and how far. */
  hold(nowMs: number): { stopMs: number } {
    const speed = this.#timeline.speedAt(nowMs);
    this.#moving = false;
    this.#ends = [];
    if (speed === 0 || this.#blocks.length === 0) return { stopMs: nowMs };
    this.#timeline.cut(nowMs);
    let rest = speed;
    for (const block of this.#blocks) {
      const left = this.#leftOf(block, nowMs);
      const need = (rest * rest) / (2 * block.acceleration);
      if (need <= left + 1e-12) {
        this.#timeline.append(nowMs, block.unit, [ramp(rest, 0, block.acceleration)]);
        break;
      }
      const slower = Math.sqrt(Math.max(0, rest * rest - 2 * block.acceleration * left));
      this.#timeline.append(nowMs, block.unit, [ramp(rest, slower, block.acceleration)]);
      this.#ends.push(this.#timeline.endMs);
      rest = slower;
    }
    return { stopMs: Math.max(nowMs, this.#timeline.endMs) };
  }

  /** Ends all motion at once and empties the queue. Returns the speed vector that was lost, units/s. */
  abandon(nowMs: number): number[] {
    const speed = this.#timeline.speedAt(nowMs);
    const unit = this.#timeline.unitAt(nowMs) ?? this.#timeline.placesAt(nowMs).counter.map(() => 0);
    this.#timeline.cut(nowMs);
    this.#blocks = [];
    this.#ends = [];
    this.#moving = false;
    return unit.map((value) => value * speed);
  }

  /** Interrupts the plan for an event in the mechanics and continues from there at the same speed. */
  disturb(nowMs: number, act: () => void): void {
    const speed = this.#timeline.speedAt(nowMs);
    this.#timeline.cut(nowMs);
    act();
    if (this.#moving) this.replan(nowMs, speed);
  }

  /** Lays the queue into the timeline anew, from where and how fast the axes are now. */
  replan(nowMs: number, speed = this.#timeline.speedAt(nowMs)): void {
    this.advance(nowMs);
    this.#timeline.cut(nowMs);
    this.#ends = [];
    const left = this.#blocks.map((block) => this.#leftOf(block, nowMs));
    const entries = this.#entrySpeeds(left, speed);
    this.#blocks.forEach((block, index) => {
      const phases = phasesOf(
        left[index]!,
        entries[index]!,
        this.#cruise(block),
        entries[index + 1]!,
        block.acceleration,
      );
      this.#timeline.append(nowMs, block.unit, phases);
      this.#timeline.settleCounter(nowMs, block.target);
      this.#ends.push(this.#timeline.endMs);
    });
    this.#moving = this.#blocks.length > 0;
  }

  /** Entry speed of each block and, last, the rest at the end: backwards for stopping, forwards for reaching. */
  #entrySpeeds(left: readonly number[], now: number): number[] {
    const blocks = this.#blocks;
    const entries = new Array<number>(blocks.length + 1).fill(0);
    for (let index = blocks.length - 1; index > 0; index -= 1) {
      const block = blocks[index]!;
      if (!block.joins) continue;
      const stoppable = Math.sqrt(entries[index + 1]! ** 2 + 2 * block.acceleration * left[index]!);
      entries[index] = Math.min(this.#cruise(block), this.#cruise(blocks[index - 1]!), stoppable);
    }
    entries[0] = now;
    for (let index = 0; index < blocks.length - 1; index += 1) {
      const reachable = Math.sqrt(entries[index]! ** 2 + 2 * blocks[index]!.acceleration * left[index]!);
      entries[index + 1] = Math.min(entries[index + 1]!, reachable);
    }
    return entries;
  }

  #cruise(block: Block): number {
    const wanted = block.speed * (block.rapid ? this.rapidFactor : this.feedFactor);
    return Math.min(wanted, block.topSpeed);
  }

  /** What is left of a block: its whole length unless the axes are on it. */
  #leftOf(block: Block, nowMs: number): number {
    if (block !== this.#blocks[0]) return block.length;
    const here = this.#timeline.placesAt(nowMs).counter;
    const done = dot(
      block.unit,
      here.map((value, axis) => value - block.from[axis]!),
    );
    return Math.max(0, block.length - done);
  }
}

/** The largest value along a direction that keeps every axis within its own. */
export function alongPath(unit: readonly number[], perAxis: readonly number[]): number {
  return Math.min(...unit.map((value, axis) => (value === 0 ? Infinity : perAxis[axis]! / Math.abs(value))));
}

function dot(a: readonly number[], b: readonly number[]): number {
  return a.reduce((sum, value, axis) => sum + value * b[axis]!, 0);
}
