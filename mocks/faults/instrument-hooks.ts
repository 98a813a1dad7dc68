// What a fault does to the instrument's answers and sweeps, once and then no more: the hooks the instrument
// offers, filled from queues, so that several faults can be armed at the same time.
import type { InstrumentFaults } from '../analyzer/faults.ts';

type Traces = Parameters<NonNullable<InstrumentFaults['onTraces']>>[0];

interface AnswerChange {
  applies: (answer: Uint8Array) => boolean;
  change: (answer: Uint8Array) => Uint8Array | undefined;
}

export class InstrumentHooks implements InstrumentFaults {
  readonly #now: () => number;
  readonly #answered: () => void;
  readonly #answerChanges: AnswerChange[] = [];
  readonly #delaysMs: number[] = [];
  readonly #traceChanges: ((traces: Traces) => void)[] = [];
  #deafUntilMs = -Infinity;

  /** `answered` is told of each answer that is about to leave. */
  constructor(now: () => number, answered: () => void) {
    this.#now = now;
    this.#answered = answered;
  }

  /** The next answer for which `applies` holds is changed; undefined swallows it. */
  changeAnswer(change: AnswerChange['change'], applies: AnswerChange['applies'] = () => true): void {
    this.#answerChanges.push({ applies, change });
  }

  delayNextAnswer(ms: number): void {
    this.#delaysMs.push(ms);
  }

  changeTraces(change: (traces: Traces) => void): void {
    this.#traceChanges.push(change);
  }

  /** Every message of the next `ms` is swallowed. */
  deafen(ms: number): void {
    this.#deafUntilMs = this.#now() + ms;
  }

  readonly onMessage = (): 'run' | 'lose' => (this.#now() < this.#deafUntilMs ? 'lose' : 'run');

  readonly onAnswer = (answer: Uint8Array): Uint8Array | undefined => {
    this.#answered();
    const at = this.#answerChanges.findIndex((armed) => armed.applies(answer));
    if (at < 0) return answer;
    return this.#answerChanges.splice(at, 1)[0]!.change(answer);
  };

  readonly delayAnswerMs = (): number => this.#delaysMs.shift() ?? 0;

  readonly onTraces = (traces: Traces): void => this.#traceChanges.shift()?.(traces);
}
