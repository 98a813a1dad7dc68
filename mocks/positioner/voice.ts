// What the simulated controller says, and what faults make of it on the way out: answers that are lost or come
// late, reports that arrive damaged.
import { type Observable, Subject } from 'rxjs';
import type { Clock } from '../../drivers/clock.ts';
import type { SerialSide } from './serial-side.ts';

export class Voice {
  readonly #clock: Clock;
  readonly #serial: SerialSide;
  readonly #answered = new Subject<number>();
  #answers = 0;
  #toLose = 0;
  #toDelay = { count: 0, ms: 0 };
  #toDamage: { count: number; damage: (text: string) => string } = { count: 0, damage: (text) => text };

  constructor(clock: Clock, serial: SerialSide) {
    this.#clock = clock;
    this.#serial = serial;
  }

  /** Counts every `ok` and `error` given, lost ones included. */
  get answered$(): Observable<number> {
    return this.#answered;
  }

  say(text: string): void {
    this.#serial.send(text);
  }

  /** An `ok` or an `error`. */
  answer(text: string): void {
    this.#answers += 1;
    if (this.#toLose > 0) this.#toLose -= 1;
    else if (this.#toDelay.count > 0) {
      this.#toDelay.count -= 1;
      this.#clock.at(this.#clock.monotonicMs() + this.#toDelay.ms, () => this.say(text));
    } else this.say(text);
    this.#answered.next(this.#answers);
  }

  report(text: string): void {
    if (this.#toDamage.count > 0) {
      this.#toDamage.count -= 1;
      this.say(this.#toDamage.damage(text));
    } else this.say(text);
  }

  loseAnswers(count: number): void {
    this.#toLose += count;
  }

  delayAnswers(count: number, ms: number): void {
    this.#toDelay = { count, ms };
  }

  damageReports(count: number, damage: (text: string) => string): void {
    this.#toDamage = { count, damage };
  }
}
