// The Analyzer over a SCPI session: whole operations, one at a time, and what is done when one fails. The
// rule: an operation leaves the session in step, or says that it could not; and after anything doubtful
// (a reconnection, a failure) the whole setup is sent and proven again before the next sweep.
import type { Clock } from '../clock.ts';
import { DriverError, isDriverError } from '../errors.ts';
import type { Link } from '../link/link.ts';
import type {
  Acquisition,
  Analyzer,
  AnalyzerIdentity,
  CalibrationState,
  PreparedSweep,
  SParameter,
  SweepSetup,
} from './analyzer.ts';
import { KnownInstrument } from './known-instrument.ts';
import { OperationQueue } from './operation-queue.ts';
import { confirmUnchanged, readTraces, runSweeps } from './scpi-acquisition.ts';
import { ScpiConversation, type TraceForm } from './scpi-conversation.ts';
import { fillTemplate, problemsOf, type ScpiDialect, type TemplateName } from './scpi-dialects.ts';
import type { SessionOpening } from './scpi-resync.ts';
import { ScpiSession } from './scpi-session.ts';
import { applySetup, type InstrumentSweep, requireSetting } from './scpi-setup.ts';
import { explainSilence, isCurable, stillOutOfStep } from './scpi-status.ts';
import { decodeIdentity } from './scpi-values.ts';
import type { TrafficNote } from './scpi-wire.ts';
import { requirePlausible } from './trace-checks.ts';

export interface ScpiAnalyzerOptions {
  dialect: ScpiDialect;
  traceFormat: TraceForm['format'];
  byteOrder: TraceForm['byteOrder'];
  /** Silence longer than this is no answer; the default is 3 s. */
  answerTimeoutMs?: number;
  /** Told of every byte, with its time. */
  onTraffic?: (note: TrafficNote) => void;
}

const defaultAnswerTimeoutMs = 3_000;
/** What an answer under way still gets when the source must go off: the command has left already. */
const graceMs = 100;

export class ScpiAnalyzer implements Analyzer {
  readonly #clock: Clock;
  readonly #dialect: ScpiDialect;
  readonly #traceForm: TraceForm;
  readonly #answerTimeoutMs: number;
  readonly #session: ScpiSession;
  readonly #operations = new OperationQueue();
  readonly #known = new KnownInstrument();
  readonly #previous = new Map<SParameter, Float64Array>();
  #setup: SweepSetup | undefined;
  #sweep: InstrumentSweep | undefined;
  /** The instrument may have lost or changed the setup: it is sent again before the next sweep. */
  #doubtful = true;
  /** Correction as it was at the last `prepare`; a power cycle may lose it in silence. */
  #correctionOn: boolean | undefined;
  #switchingOff: Promise<void> | undefined;
  /** The last failure of opening: what failed that way is not tried twice in one operation. */
  #openingFailed: unknown;

  /** Opens nothing. Throws ANALYZER_BAD_DIALECT. */
  constructor(link: Link, clock: Clock, options: ScpiAnalyzerOptions) {
    const problems = problemsOf(options.dialect);
    if (problems.length > 0) {
      throw new DriverError(
        'ANALYZER_BAD_DIALECT',
        `dialect ${options.dialect.name}: ${problems.join('; ')}`,
        { dialect: options.dialect.name },
      );
    }
    this.#clock = clock;
    this.#dialect = options.dialect;
    this.#traceForm = { format: options.traceFormat, byteOrder: options.byteOrder };
    this.#answerTimeoutMs = options.answerTimeoutMs ?? defaultAnswerTimeoutMs;
    const [errorQuery = ''] = this.#messagesOf('errorQuery');
    this.#session = new ScpiSession(link, clock, {
      errorQuery,
      answerTimeoutMs: this.#answerTimeoutMs,
      onTraffic: options.onTraffic,
    });
  }

  /** Question and answer are known to belong together. */
  get inStep(): boolean {
    return this.#session.standing.kind === 'in-step';
  }

  identify(signal?: AbortSignal): Promise<AnalyzerIdentity> {
    return this.#operate(signal, async (talk, stop) => {
      if (!this.inStep) return (await this.#open(stop)).identity;
      const identity = await talk.askPlain('*IDN?', decodeIdentity);
      this.#meet(identity, false);
      return identity;
    });
  }

  prepare(setup: SweepSetup, signal?: AbortSignal): Promise<PreparedSweep> {
    return this.#operate(signal, async (talk, stop) => {
      await this.#bringInStep(stop);
      this.#setup = { ...setup, parameters: [...new Set(setup.parameters)] };
      this.#previous.clear();
      this.#correctionOn = undefined;
      const sweep = await this.#applySetup(talk);
      // Whatever was lost before: everything is set anew, and the caller sees what there is.
      this.#known.forgetPowerCycle();
      return sweep;
    });
  }

  async acquire(parameters?: readonly SParameter[], signal?: AbortSignal): Promise<Acquisition> {
    const wanted = [...new Set(parameters ?? this.#setup?.parameters ?? [])];
    const strange = wanted.find((parameter) => !this.#setup?.parameters.includes(parameter));
    if (!this.#setup || strange) throw new Error(`defect: ${strange ?? 'a sweep'} was not prepared`);
    try {
      return await this.#operate(signal, (talk, stop) => this.#acquire(talk, stop, wanted));
    } catch (error) {
      // A refused start, an unfinished trace, a setting changed at the front panel: the setup is sent
      // again and one more sweep decides.
      if (!isCurable(error) && !wasChangedMeanwhile(error)) throw error;
      return this.#operate(signal, (talk, stop) => this.#acquire(talk, stop, wanted));
    }
  }

  source(on: boolean, signal?: AbortSignal): Promise<void> {
    if (!on) return this.#sourceOff();
    return this.#operate(signal, async (talk, stop) => {
      await this.#bringInStep(stop);
      await talk.tell('output', { onOff: 'ON' });
      await talk.throwErrors('switching the source on');
      requireSetting('output', true, await talk.askBoolean('outputQuery'));
    });
  }

  calibrationState(signal?: AbortSignal): Promise<CalibrationState> {
    return this.#operate(signal, async (talk, stop) => {
      await this.#bringInStep(stop);
      // An instrument that has no such question has no correction of its own either.
      const correctionOn = talk.has('correctionQuery') && (await talk.askBoolean('correctionQuery'));
      return {
        correctionOn,
        ...(talk.has('correctionInterpolatedQuery') && {
          interpolated: await talk.askBoolean('correctionInterpolatedQuery'),
        }),
        ...(talk.has('correctionDateQuery') && { date: await talk.askWord('correctionDateQuery') }),
      };
    });
  }

  /**
   * Like the interface says; throws ANALYZER_POWER_CYCLED once after a power cycle although everything is
   * prepared again, and ANALYZER_SETTING_DIFFERS as long as the correction is not what it was.
   */
  recover(signal?: AbortSignal): Promise<void> {
    return this.#operate(signal, async (talk, stop) => {
      await this.#open(stop);
      if (this.#setup) await this.#applySetup(talk);
      this.#known.tellOfPowerCycle();
    });
  }

  async close(): Promise<void> {
    // Switching off is the one thing that closing does not cut short; its caller hears how it went.
    await Promise.allSettled([this.#switchingOff]);
    const reason = new DriverError('ANALYZER_INTERRUPTED', 'the analyzer was closed');
    this.#session.hurry(0, reason);
    this.#operations.interrupt(reason);
    await this.#operations.run(() => this.#session.close());
  }

  async #acquire(
    talk: ScpiConversation,
    stop: AbortSignal,
    wanted: readonly SParameter[],
  ): Promise<Acquisition> {
    await this.#bringInStep(stop);
    this.#known.tellOfPowerCycle();
    const setup = this.#setup;
    const sweep = this.#doubtful || !this.#sweep ? await this.#applySetup(talk) : this.#sweep;
    if (!setup) throw new Error('defect: nothing is prepared');
    const run = await this.#runSweeps(talk, stop, sweep);
    const traces = await readTraces(talk, sweep, wanted);
    await confirmUnchanged(talk, setup, sweep);
    for (const [parameter, trace] of traces) {
      requirePlausible(parameter, trace, this.#previous.get(parameter));
      this.#previous.set(parameter, trace.slice());
    }
    return { ...run, traces };
  }

  async #runSweeps(
    talk: ScpiConversation,
    stop: AbortSignal,
    sweep: InstrumentSweep,
  ): Promise<Omit<Acquisition, 'traces'>> {
    try {
      return await runSweeps(talk, sweep, this.#answerTimeoutMs);
    } catch (error) {
      // Whoever gave up waiting must not leave a sweep running; nothing is awaited of the instrument.
      if (stop.aborted) await this.#shout('abort');
      throw error;
    }
  }

  async #applySetup(talk: ScpiConversation): Promise<InstrumentSweep> {
    if (!this.#setup) throw new Error('defect: nothing is prepared');
    this.#doubtful = true;
    const sweep = await applySetup(talk, this.#setup);
    if (talk.has('correctionQuery')) {
      const correctionOn = await talk.askBoolean('correctionQuery');
      requireSetting('correction', this.#correctionOn ?? correctionOn, correctionOn);
      this.#correctionOn = correctionOn;
    }
    this.#sweep = sweep;
    this.#doubtful = false;
    return sweep;
  }

  async #bringInStep(stop: AbortSignal): Promise<void> {
    if (!this.inStep) await this.#open(stop);
  }

  /** Opens the session anew, proves step, and compares who answers. */
  async #open(stop: AbortSignal, urgent: readonly string[] = []): Promise<SessionOpening> {
    this.#doubtful = true;
    try {
      const opening = await this.#session.resynchronize(stop, urgent);
      this.#meet(opening.identity, opening.powerOn);
      return opening;
    } catch (error) {
      this.#openingFailed = error;
      throw error;
    }
  }

  #meet(identity: AnalyzerIdentity, powerOn: boolean): void {
    try {
      this.#known.meet(identity, powerOn);
    } catch (error) {
      // It answers in step, and is still not to be spoken to.
      this.#session.distrust('another instrument answers');
      this.#openingFailed = error;
      throw error;
    }
  }

  #operate<T>(
    signal: AbortSignal | undefined,
    work: (talk: ScpiConversation, stop: AbortSignal) => Promise<T>,
  ): Promise<T> {
    return this.#operations.run(async (stop) => {
      try {
        return await work(this.#converse(stop, signal), stop);
      } catch (error) {
        throw await this.#afterFailure(error, stop);
      }
    }, signal);
  }

  #converse(stop: AbortSignal, signal: AbortSignal | undefined): ScpiConversation {
    return new ScpiConversation({
      session: this.#session,
      clock: this.#clock,
      dialect: this.#dialect,
      traceForm: this.#traceForm,
      stop,
      signal,
    });
  }

  /** Brings the session back into step where that can be done at once; returns the error to throw. */
  async #afterFailure(error: unknown, stop: AbortSignal): Promise<unknown> {
    this.#doubtful = true;
    if (stop.aborted) return stop.reason;
    if (!(error instanceof DriverError)) return error;
    // A closed link is reported at once; reopening it takes patience, which is the caller's.
    if (this.#session.standing.kind !== 'out-of-step' || error === this.#openingFailed) return error;
    try {
      const opening = await this.#open(stop);
      this.#known.tellOfPowerCycle(error);
      return explainSilence(error, opening.errors);
    } catch (second) {
      return stop.aborted ? stop.reason : stillOutOfStep(error, second);
    }
  }

  /** Two calls make one: the second must not overtake the first. */
  #sourceOff(): Promise<void> {
    this.#switchingOff ??= this.#overtakeAndSwitchOff().finally(() => {
      this.#switchingOff = undefined;
    });
    return this.#switchingOff;
  }

  async #overtakeAndSwitchOff(): Promise<void> {
    const reason = new DriverError('ANALYZER_INTERRUPTED', 'switching the source off came first');
    const commands: TemplateName[] = this.#operations.isBusy ? ['abort', 'output'] : ['output'];
    const urgent = commands.flatMap((name) => this.#messagesOf(name));
    // The bytes leave now, whatever is being waited for; whether they worked is asked below. No signal
    // takes part: one that is aborted already must not keep the source on.
    if (this.#session.standing.kind !== 'closed') void this.#shout(...commands);
    this.#session.hurry(graceMs, reason);
    this.#operations.interrupt(reason);
    await this.#operations.run(async (stop) => {
      const talk = this.#converse(stop, undefined);
      if (this.inStep) {
        try {
          return await this.#confirmOff(talk);
        } catch (error) {
          if (!isDriverError(error) || error.code === 'ANALYZER_SETTING_DIFFERS') throw error;
        }
      }
      await this.#open(stop, urgent);
      await this.#confirmOff(talk);
    });
  }

  async #confirmOff(talk: ScpiConversation): Promise<void> {
    await talk.tell('output', { onOff: 'OFF' });
    requireSetting('output', false, await talk.askBoolean('outputQuery'));
  }

  /** Sends commands past everything. What cannot be sent is found out by those who ask afterwards. */
  async #shout(...names: TemplateName[]): Promise<void> {
    try {
      await this.#session.shout(names.flatMap((name) => this.#messagesOf(name)));
    } catch (error) {
      this.#session.distrust(
        `a command could not be sent: ${error instanceof Error ? error.message : error}`,
      );
    }
  }

  #messagesOf(name: TemplateName): string[] {
    const template = this.#dialect.templates[name];
    return template ? fillTemplate(template, { channel: this.#dialect.channel, onOff: 'OFF' }) : [];
  }
}

/** The grid was right when it was prepared and wrong after the sweep. */
function wasChangedMeanwhile(error: unknown): boolean {
  return isDriverError(error, 'ANALYZER_SETTING_DIFFERS') && error.facts['afterSweep'] === true;
}
