// Where every axis is at any instant of the clock: a list of stretches of constant acceleration, the past
// kept for readers that look back over a sweep, the future as planned now. Each stretch carries three places
// per axis: the counter (what the controller believes), the motor (what the pulses made of it) and the shaft
// behind the gear play. Knows no commands; the planner appends and cuts.
import type { Phase } from './speed-profile.ts';

export interface Places {
  /** What the controller reports, in its units. */
  counter: number[];
  /** Where the motor stands; differs from the counter after lost steps or a restart. */
  motor: number[];
  /** Where the output shaft stands, behind the play of the gear. */
  shaft: number[];
}

interface Stretch extends Places {
  startMs: number;
  endMs: number;
  unit: number[];
  /** Motor travel per unit of counter travel: 0 for a stalled axis. */
  follow: number[];
  speed: number;
  acceleration: number;
}

const keptStretches = 8_192;

export class Timeline {
  readonly #stretches: Stretch[];
  /** Width of the gear play per axis: the shaft follows the motor upwards and lags by this downwards. */
  readonly #play: readonly number[];
  /** Motor travel per counter unit for what is appended from now on; 0 stalls an axis. */
  readonly follow: number[];

  constructor(play: readonly number[], shaft: readonly number[]) {
    const still = play.map(() => 0);
    this.#play = play;
    this.follow = play.map(() => 1);
    const places = { counter: still.slice(), motor: shaft.slice(), shaft: shaft.slice() };
    this.#stretches = [
      {
        startMs: -Infinity,
        endMs: -Infinity,
        unit: still,
        follow: still,
        speed: 0,
        acceleration: 0,
        ...places,
      },
    ];
  }

  /** When the last planned stretch ends. */
  get endMs(): number {
    return this.#stretches.at(-1)!.endMs;
  }

  placesAt(ms: number): Places {
    return this.#placesIn(this.#stretchAt(ms), ms);
  }

  /** Speed along the path in units/s; 0 at rest. */
  speedAt(ms: number): number {
    const stretch = this.#stretchAt(ms);
    if (ms >= stretch.endMs) return 0;
    return Math.max(0, stretch.speed + (stretch.acceleration * (ms - stretch.startMs)) / 1000);
  }

  /** Direction of travel at a moment, or undefined at rest. */
  unitAt(ms: number): readonly number[] | undefined {
    const stretch = this.#stretchAt(ms);
    return ms < stretch.endMs ? stretch.unit : undefined;
  }

  /** Forgets what was planned after `ms`; what is under way ends there. */
  cut(ms: number): void {
    const list = this.#stretches;
    while (list.length > 1) {
      const last = list.at(-1)!;
      if (last.startMs < ms || (last.startMs === ms && last.endMs === ms)) break;
      list.pop();
    }
    const last = list.at(-1)!;
    if (last.endMs > ms) last.endMs = ms;
  }

  /** Appends phases along `unit` from `startMs` on, or from the end of what is planned if that is later. */
  append(startMs: number, unit: readonly number[], phases: readonly Phase[]): void {
    for (const phase of phases) {
      const from = Math.max(startMs, this.endMs);
      const { speed, acceleration } = phase;
      const endMs = from + phase.seconds * 1000;
      const follow = [...this.follow];
      this.#push({
        startMs: from,
        endMs,
        unit: [...unit],
        follow,
        speed,
        acceleration,
        ...this.placesAt(from),
      });
    }
  }

  /** Corrects the counter to exactly `counter` at the end of what is planned (rounding, homing, restart). */
  settleCounter(atMs: number, counter: readonly number[]): void {
    this.#event(atMs, (places) => {
      places.counter = [...counter];
    });
  }

  /** Moves one motor without the counter: lost steps, a motor running on after a dead stop, a gust. */
  slip(atMs: number, axis: number, units: number): void {
    this.#event(atMs, (places) => {
      places.motor[axis] = places.motor[axis]! + units;
      places.shaft = this.#behind(places.shaft, places.motor);
    });
  }

  /** First moment in what is planned after `fromMs` at which `test` of the places becomes true. */
  firstWhen(fromMs: number, test: (places: Places) => boolean): number | undefined {
    for (const stretch of this.#stretches) {
      if (stretch.endMs <= fromMs || !test(this.#placesIn(stretch, stretch.endMs))) continue;
      let before = Math.max(fromMs, stretch.startMs);
      let after = stretch.endMs;
      for (let round = 0; round < 60; round += 1) {
        const middle = (before + after) / 2;
        if (test(this.#placesIn(stretch, middle))) after = middle;
        else before = middle;
      }
      return after;
    }
    return undefined;
  }

  #event(atMs: number, change: (places: Places) => void): void {
    const from = Math.max(atMs, this.endMs);
    const places = this.placesAt(from);
    change(places);
    const unit = this.#play.map(() => 0);
    this.#push({ startMs: from, endMs: from, unit, follow: unit, speed: 0, acceleration: 0, ...places });
  }

  #push(stretch: Stretch): void {
    this.#stretches.push(stretch);
    if (this.#stretches.length > keptStretches) this.#stretches.splice(1, keptStretches / 2);
  }

  #stretchAt(ms: number): Stretch {
    const list = this.#stretches;
    let low = 0;
    let high = list.length - 1;
    while (low < high) {
      const middle = (low + high + 1) >> 1;
      if (list[middle]!.startMs <= ms) low = middle;
      else high = middle - 1;
    }
    return list[low]!;
  }

  #placesIn(stretch: Stretch, ms: number): Places {
    const seconds =
      stretch.endMs === stretch.startMs ? 0 : (Math.min(ms, stretch.endMs) - stretch.startMs) / 1000;
    const path = stretch.speed * seconds + (stretch.acceleration * seconds * seconds) / 2;
    const counter = stretch.counter.map((value, axis) => value + stretch.unit[axis]! * path);
    const motor = stretch.motor.map(
      (value, axis) => value + stretch.unit[axis]! * path * stretch.follow[axis]!,
    );
    return { counter, motor, shaft: this.#behind(stretch.shaft, motor) };
  }

  /** The play of a gear: pushed up by the motor's lower flank, down by its upper one, else left alone. */
  #behind(shaft: readonly number[], motor: readonly number[]): number[] {
    return shaft.map((value, axis) => {
      const low = motor[axis]!;
      return Math.min(Math.max(value, low), low + this.#play[axis]!);
    });
  }
}
