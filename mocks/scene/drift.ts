// How the bench's transmission wanders with time: straight lines, and a slow random walk that is a function
// of time alone, so that asking twice or out of order gives the same answer.
import { type RandomStream, stream } from '../random.ts';
import type { CompleteScene } from './scene-description.ts';

const hourMs = 3_600_000;
/** The walk takes one step a minute and runs straight in between. */
const stepMs = 60_000;

export class Drift {
  readonly #drift: CompleteScene['drift'];
  readonly #levelWalk: Walk;
  readonly #phaseWalk: Walk;

  constructor(drift: CompleteScene['drift'], seed: number | string) {
    this.#drift = drift;
    this.#levelWalk = new Walk(stream(seed, 'drift-level'));
    this.#phaseWalk = new Walk(stream(seed, 'drift-phase'));
  }

  levelDb(sinceStartMs: number): number {
    const { dbPerHour, walkDb } = this.#drift;
    const line = (dbPerHour * sinceStartMs) / hourMs;
    return walkDb === 0 ? line : line + walkDb * this.#levelWalk.at(sinceStartMs);
  }

  phaseDeg(sinceStartMs: number): number {
    const { degPerHour, walkDeg } = this.#drift;
    const line = (degPerHour * sinceStartMs) / hourMs;
    return walkDeg === 0 ? line : line + walkDeg * this.#phaseWalk.at(sinceStartMs);
  }
}

/** A random walk of standard deviation 1 after an hour; 0 before its start. */
class Walk {
  readonly #random: RandomStream;
  readonly #knots: number[] = [0];

  constructor(random: RandomStream) {
    this.#random = random;
  }

  at(sinceStartMs: number): number {
    const place = Math.max(0, sinceStartMs / stepMs);
    const before = Math.floor(place);
    while (this.#knots.length < before + 2) {
      this.#knots.push(this.#knots.at(-1)! + this.#random.normal(0, Math.sqrt(stepMs / hourMs)));
    }
    const from = this.#knots[before]!;
    return from + (place - before) * (this.#knots[before + 1]! - from);
  }
}
