// What a run puts on record: samples, one at a time on their way to the disk, and what happened beside them.
// Knows the archive and the clock, and nothing of devices or of the order of things.
import type { Clock } from '../../drivers/clock.ts';
import type { Archive, RunRef, RunState, SampleRecord } from '../archive/archive.ts';

export class RunJournal {
  readonly run: RunRef;
  readonly #archive: Archive;
  readonly #clock: Clock;
  /** The segment that notes belong to; 0 before the first. */
  segment: number;
  /** Sequence of the last sample that was handed over. */
  sequence: number;
  /** The one sample that may still be on its way to the disk, and its announcement. */
  #pending: Promise<void> = Promise.resolve();

  /** `taken`: segments and samples that a resumed run has already. */
  constructor(run: RunRef, archive: Archive, clock: Clock, taken = { segments: 0, samples: 0 }) {
    this.run = run;
    this.#archive = archive;
    this.#clock = clock;
    this.segment = taken.segments;
    this.sequence = taken.samples;
  }

  /** Hands a sample over; `announce` is called when it is durable. Await `durable` before the next sweep. */
  keep(sample: SampleRecord, announce: () => void = () => {}): void {
    this.sequence = sample.sequence;
    this.#pending = this.#archive.addSample(this.run.number, sample).then(announce);
    // Awaited before the next sweep; until then a failure must not count as unhandled.
    this.#pending.catch(() => {});
  }

  /** Resolves when all that was handed over is durable and announced; rejects when it could not be stored. */
  durable(): Promise<void> {
    return this.#clock.whileReal(this.#pending);
  }

  note(kind: string, text: string, facts: Readonly<Record<string, unknown>> = {}): Promise<void> {
    return this.#clock.whileReal(
      this.#archive.addEvent(this.run.number, {
        segment: this.segment,
        wallMs: this.#clock.wallMs(),
        monotonicMs: this.#clock.monotonicMs(),
        kind,
        text,
        facts,
      }),
    );
  }

  end(state: Exclude<RunState, 'running'>, reason: string | undefined): Promise<void> {
    return this.#clock.whileReal(this.#archive.endRun(this.run.number, state, this.#clock.wallMs(), reason));
  }
}
