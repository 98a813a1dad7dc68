// The order of things in a run: connect, home, then for each planned step move, settle, sweep, check, keep.
// It alone commands motion. At most one sample waits to become durable while the axes move on; the next
// sweep starts only when it is. Whatever happens, it ends with motors still and the source off.
//
//   connect ─► createRun ─► step ─► step ─► … ─► safe stop ─► endRun
//                           │  ▲
//        a segment is due ──┤  └─ again ── failure ── give up ─► safe stop ─► endRun
//        (start, reopened)  └─► devices back, homed, tied
import { type Observable, Subject } from 'rxjs';
import type { SweepSetup } from '../../drivers/analyzer/analyzer.ts';
import type { Clock } from '../../drivers/clock.ts';
import { DriverError, isDriverError } from '../../drivers/errors.ts';
import type { Position } from '../../drivers/positioner/positioner.ts';
import type { Archive, NewRun, RunRef, RunState, SampleRecord } from '../archive/archive.ts';
import { DaemonError } from '../errors.ts';
import type { PlannedStep } from '../plan/expand.ts';
import { type AxisRest, checkUntouched, restEvent, restNow } from './axis-rest.ts';
import type { Device, RunEvent } from './events.ts';
import { from, measurePosition, type PositionTools, StepFailure } from './measure-position.ts';
import { medianDifferenceDb } from './repeat-check.ts';
import { reactionTo, segmentsPerRun, triesPerPosition, waitBeforeRetryMs } from './retry-table.ts';
import { RunJournal } from './run-journal.ts';
import { type Bench, safeStop } from './safe-stop.ts';
import { type Connected, connect, openSegment, type SegmentTools, waitForDevice } from './segments.ts';
import { timeLeft } from './time-left.ts';

export interface RunOrder {
  /** What the archive freezes; the start time is filled in by the run. */
  record: Omit<NewRun, 'startedWallMs'>;
  sweep: SweepSetup;
  steps: readonly PlannedStep[];
  /** Predicted time of each step without its acquisition. */
  motionMs: readonly number[];
  boresight: Position;
  /** Where the last run left the axes; absent for the first, or when the operator vouches for the zero. */
  lastRest?: AxisRest;
  /** The analyzer port of the AUT. */
  autPort: 1 | 2;
  /** Where an interrupted run goes on; absent for a new one. */
  resume?: ResumePoint;
}

export interface ResumePoint {
  run: RunRef;
  /** Segments and samples it has already. */
  segments: number;
  samples: number;
  /** Its last positions, to be taken again and compared. */
  repeats: readonly { step: PlannedStep; trace: Float64Array }[];
}

export interface RunOutcome {
  run: RunRef;
  state: Exclude<RunState, 'running'>;
  /** Why it did not complete. */
  error?: unknown;
  /** What safe stop could not confirm; empty when motors are still and the source is off. */
  unconfirmed: unknown[];
}

/** Why a segment must be opened, and the devices that have to be met anew before. */
interface DueSegment {
  reason: string;
  away: Set<Device>;
}

export class RunLoop {
  readonly #bench: Bench;
  readonly #archive: Archive;
  readonly #clock: Clock;
  readonly #order: RunOrder;
  readonly #events = new Subject<RunEvent>();
  readonly #tools: SegmentTools;
  #opened: { journal: RunJournal; connected: Connected } | undefined;
  /** The segment that must be opened before the next sample; at first the run's own. */
  #due: DueSegment | undefined = { reason: 'start', away: new Set() };

  constructor(bench: Bench, archive: Archive, clock: Clock, order: RunOrder) {
    this.#bench = bench;
    this.#archive = archive;
    this.#clock = clock;
    this.#order = order;
    if (order.resume) this.#due = { reason: 'resumed', away: new Set() };
    this.#tools = { bench, archive, clock, tell: (event) => this.#tell(event) };
  }

  /** Hot; the run does not wait for watchers. */
  get events$(): Observable<RunEvent> {
    return this.#events;
  }

  /**
   * Executes the whole order. Throws only while nothing has been created yet (devices not there, settings
   * refused); from then on the outcome says what happened. Never leaves motors turning or the source on
   * without saying so in `unconfirmed`.
   */
  async execute(signal: AbortSignal): Promise<RunOutcome> {
    const { resume, sweep } = this.#order;
    let connected: Connected;
    try {
      connected = await connect(this.#bench, this.#clock, sweep, resume !== undefined, signal);
      await this.#checkUntouched(signal);
    } catch (error) {
      await safeStop(this.#bench);
      throw causeOf(error, signal);
    }
    const run = resume?.run ?? (await this.#createRun());
    const journal = new RunJournal(run, this.#archive, this.#clock, resume);
    this.#opened = { journal, connected };
    let error: unknown;
    try {
      await this.#measure(journal, connected, signal);
    } catch (thrown) {
      error = causeOf(thrown, signal);
    }
    const unconfirmed = await safeStop(this.#bench);
    const rest = await restNow(this.#bench.positioner);
    const where = rest.known ? 'the axes are at rest' : 'where the axes stand is not known';
    // A disk that is full has ended the run already, and is told of at its end.
    await journal.note(restEvent, where, { ...rest }).catch(() => {});
    return this.#end(journal, error, unconfirmed);
  }

  #createRun(): Promise<RunRef> {
    const startedWallMs = this.#clock.wallMs();
    return this.#clock.whileReal(this.#archive.createRun({ ...this.#order.record, startedWallMs }));
  }

  /** Before anything moves: axes without a home switch must be where the last run left them. */
  async #checkUntouched(signal: AbortSignal): Promise<void> {
    const { lastRest } = this.#order;
    const { positioner } = this.#bench;
    if (!lastRest || positioner.axes.every((axis) => axis.homing === 'switch')) return;
    const now = await from('positioner', positioner.readPosition(signal));
    checkUntouched(positioner, lastRest, now);
  }

  async #measure(journal: RunJournal, connected: Connected, signal: AbortSignal): Promise<void> {
    const { steps, motionMs } = this.#order;
    const predictedMs = motionMs.map((ms) => ms + connected.sweep.acquisitionMs);
    const left = timeLeft(predictedMs);
    const expectedMs = predictedMs.reduce((sum, ms) => sum + ms, 0);
    this.#tell({ kind: 'started', run: journal.run, steps: steps.length, expectedMs });
    const startMs = this.#clock.monotonicMs();
    for (const [index, step] of steps.entries()) {
      const sample = await this.#takeStep(step, signal);
      const leftMs = left.finished(index, this.#clock.monotonicMs() - startMs);
      const done = index + 1;
      journal.keep(sample, () => this.#tell({ kind: 'sample', sample, done, steps: steps.length, leftMs }));
    }
    await journal.durable();
  }

  /** One position, with as many tries as the retry table allows. */
  async #takeStep(step: PlannedStep, signal: AbortSignal): Promise<SampleRecord> {
    let revisit = false;
    // A segment that opened, with its tie, shows that both devices work: tries count from there.
    let tries = 0;
    for (let attempt = 1; ; attempt += 1) {
      try {
        if (this.#due) {
          revisit = (await this.#openDueSegment(this.#due, step, signal)) || revisit;
          tries = 0;
        }
        return await this.#sample(step, attempt, revisit, signal);
      } catch (failure) {
        if (!(failure instanceof StepFailure) || signal.aborted) throw failure;
        tries += 1;
        revisit = await this.#afterFailure(failure, step, tries, signal);
      }
    }
  }

  #sample(step: PlannedStep, attempt: number, revisit: boolean, signal: AbortSignal): Promise<SampleRecord> {
    const { autPort } = this.#order;
    const { journal } = this.#open();
    const tools: PositionTools = {
      ...this.#bench,
      clock: this.#clock,
      transmission: 'S21',
      match: autPort === 1 ? 'S11' : 'S22',
      beforeDurable: () => journal.durable(),
    };
    const context = {
      segment: journal.segment,
      sequence: journal.sequence + 1,
      setup: journal.segment,
      attempt,
      revisit,
    };
    return measurePosition(tools, step, context, signal);
  }

  /** Does what the retry table says, or throws; true when the axes must come back from the approach side. */
  async #afterFailure(
    failure: StepFailure,
    step: PlannedStep,
    tries: number,
    signal: AbortSignal,
  ): Promise<boolean> {
    const error = failure.cause;
    if (!isDriverError(error)) throw error;
    const reaction = reactionTo(error.code, failure.device);
    if (reaction === 'give-up' || (reaction === 'rehome' && !this.#canRehome())) throw error;
    if (tries >= triesPerPosition) {
      throw new DaemonError(
        'RUN_GAVE_UP',
        `${tries} tries at ${step.cut || 'boresight'} ${step.angleDeg}° failed; the last: ${error.message}`,
        { code: error.code, tries, ...error.facts },
        error,
      );
    }
    const waitMs = waitBeforeRetryMs(tries);
    const { device } = failure;
    const { code, message: text, facts } = error;
    await this.#open().journal.note('retry', text, { device, code, attempt: tries, ...facts });
    this.#tell({ kind: 'retry', device, code, text, facts, attempt: tries, waitMs });
    await this.#clock.sleep(waitMs, signal);
    if (reaction === 'again') return device === 'positioner';
    this.#due ??= { reason: `${device}: ${error.code}`, away: new Set() };
    this.#due.away.add(device);
    return true;
  }

  /**
   * Opens the segment that is due: sessions proven, axes homed if their reference went, and after an
   * interruption a tie. It stays due until all of that has succeeded. True when axes may have moved.
   */
  async #openDueSegment(due: DueSegment, step: PlannedStep, signal: AbortSignal): Promise<boolean> {
    const { journal, connected } = this.#open();
    const mayHaveMoved = journal.segment > 0;
    if (journal.segment - (this.#order.resume?.segments ?? 0) >= segmentsPerRun) {
      throw new DaemonError('RUN_GAVE_UP', `${journal.segment} interruptions in one run`, {
        reason: due.reason,
      });
    }
    for (const device of due.away) {
      await from(device, waitForDevice(this.#tools, device, signal));
      due.away.delete(device);
    }
    await journal.durable();
    journal.segment += 1;
    await journal.note('segment', due.reason, { segment: journal.segment });
    await openSegment(this.#tools, journal.run.number, journal.segment, due.reason, connected, signal);
    if (due.reason !== 'start') {
      const tie: PlannedStep = { ...step, purpose: 'tie', angleDeg: 0, target: this.#order.boresight };
      journal.keep(await this.#sample(tie, 1, true, signal));
    }
    if (due.reason === 'resumed') await this.#repeatLast(journal, signal);
    this.#due = undefined;
    return mayHaveMoved;
  }

  /** The last positions before the interruption once more: what they differ by is told and kept. */
  async #repeatLast(journal: RunJournal, signal: AbortSignal): Promise<void> {
    for (const { step, trace } of this.#order.resume?.repeats ?? []) {
      const sample = await this.#sample({ ...step, purpose: 'repeat' }, 1, true, signal);
      journal.keep(sample);
      const differenceDb = medianDifferenceDb(trace, sample.traces.get('S21') ?? trace);
      const text = `${step.cut} ${step.angleDeg}° repeated: ${differenceDb.toFixed(3)} dB from before`;
      await journal.note('repeat', text, { cut: step.cut, angleDeg: step.angleDeg, differenceDb });
    }
  }

  /** Only axes with a home switch can find their angle again without a person. */
  #canRehome(): boolean {
    return this.#bench.positioner.axes.every((axis) => axis.homing === 'switch');
  }

  async #end(journal: RunJournal, error: unknown, unconfirmed: unknown[]): Promise<RunOutcome> {
    // What was taken is safe before the run is called ended.
    await journal.durable().catch(() => {});
    for (const trouble of unconfirmed) {
      const text = `not confirmed at the end: ${messageOf(trouble)}`;
      await journal.note('trouble', text);
      this.#tell({ kind: 'trouble', text });
    }
    const { run } = journal;
    const state = error === undefined ? 'complete' : stateAfter(error);
    const reason = error === undefined ? undefined : messageOf(error);
    await journal.end(state, reason);
    this.#tell({ kind: 'ended', run, state, ...(reason === undefined ? {} : { reason }) });
    return { run, state, unconfirmed, ...(error === undefined ? {} : { error }) };
  }

  #open(): { journal: RunJournal; connected: Connected } {
    if (!this.#opened) throw new DaemonError('DEFECT', 'the run has not been created yet');
    return this.#opened;
  }

  #tell(event: RunEvent): void {
    this.#events.next(event);
  }
}

/** A stop asked for is an interruption, whatever error it surfaced as. */
function causeOf(error: unknown, signal: AbortSignal): unknown {
  if (signal.aborted) {
    return new DaemonError('RUN_INTERRUPTED', 'stopped on request', {}, error);
  }
  if (!(error instanceof StepFailure)) return error;
  const { cause, device } = error;
  if (!isDriverError(cause) || !cause.code.startsWith('LINK_')) return cause;
  return new DriverError(cause.code, `${device}: ${cause.message}`, cause.facts, cause);
}

const resumableCodes: readonly string[] = ['RUN_INTERRUPTED', 'RUN_GAVE_UP', 'ARCHIVE_WRITE_FAILED'];

/** Trouble with the world, a full disk among it, can be resumed; a defect cannot. */
function stateAfter(error: unknown): 'interrupted' | 'failed' {
  const resumable =
    isDriverError(error) || (error instanceof DaemonError && resumableCodes.includes(error.code));
  return resumable ? 'interrupted' : 'failed';
}

function messageOf(error: unknown): string {
  return error instanceof Error ? error.message : String(error);
}
