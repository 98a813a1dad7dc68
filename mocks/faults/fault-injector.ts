// Decides when faults strike: now, at a moment, after so many answers of a device, or as a seed draws them.
// Keeps a journal, so that a test can tell what really happened.
import type { Clock } from '../../drivers/clock.ts';
import { type RandomStream, stream } from '../random.ts';
import { type Fault, type FaultTargets, faultNamed, faults } from './fault-table.ts';

export interface InjectedFault {
  name: string;
  atMs: number;
}

/** A plan of faults: moments of the bench's clock. */
export type FaultPlan = readonly InjectedFault[];

/** `count` faults between two moments, from `names` (default all), in order of time; the seed decides. */
export function drawFaults(
  seed: number | string,
  options: { count: number; fromMs: number; toMs: number; names?: readonly string[] },
): FaultPlan {
  const random: RandomStream = stream(seed, 'fault-plan');
  const names = options.names ?? faults.map((fault) => fault.name);
  const plan = Array.from({ length: options.count }, () => ({
    name: names[random.integer(names.length)]!,
    atMs: random.uniform(options.fromMs, options.toMs),
  }));
  return plan.sort((a, b) => a.atMs - b.atMs);
}

export class FaultInjector {
  readonly #clock: Clock;
  readonly #targets: FaultTargets;
  readonly #waiting: { target: Fault['target']; left: number; name: string }[] = [];
  readonly #journal: InjectedFault[] = [];

  constructor(clock: Clock, targets: Omit<FaultTargets, 'later'>) {
    this.#clock = clock;
    this.#targets = {
      ...targets,
      later: (ms, act) => void clock.at(clock.monotonicMs() + ms, act),
    };
    targets.controller.answered$.subscribe(() => this.answered('positioner'));
  }

  /** What has struck so far, in order. */
  get journal(): readonly InjectedFault[] {
    return this.#journal;
  }

  /** Strikes now. False when there is no fault of that name. */
  inject(name: string): boolean {
    const fault = faultNamed(name);
    if (!fault) return false;
    this.#journal.push({ name, atMs: this.#clock.monotonicMs() });
    fault.inject(this.#targets);
    return true;
  }

  /** Strikes at the moments of a plan. */
  follow(plan: FaultPlan): void {
    for (const { name, atMs } of plan) this.#clock.at(atMs, () => void this.inject(name));
  }

  /** Strikes when the device it concerns has given `answers` more answers. */
  injectAfter(name: string, answers: number): boolean {
    const fault = faultNamed(name);
    if (!fault) return false;
    this.#waiting.push({ target: fault.target, left: answers, name });
    return true;
  }

  /** Told by the devices, once for each answer. */
  answered(target: Fault['target']): void {
    for (const waiting of [...this.#waiting]) {
      if (waiting.target !== target) continue;
      waiting.left -= 1;
      if (waiting.left > 0) continue;
      this.#waiting.splice(this.#waiting.indexOf(waiting), 1);
      this.inject(waiting.name);
    }
  }
}
