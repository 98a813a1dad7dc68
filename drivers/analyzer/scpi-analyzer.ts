// The Analyzer over a SCPI session: what each operation does. Their order, and what becomes of the session when
// one fails, is in scpi-operations.ts; after anything doubtful (a reconnection, a failure) the whole setup is
// sent and proven again before the next sweep.
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
import { confirmEnd, confirmUnchanged, readTraces, runSweeps, type SweepRun } from './scpi-acquisition.ts';
import type { ScpiConversation, TraceForm } from './scpi-conversation.ts';
import { ScpiOperations } from './scpi-operations.ts';
import { applySetup, type InstrumentSweep, requireSetting } from './scpi-setup.ts';
import { isCurable } from './scpi-status.ts';
import { problemsOf, type ScpiDialect } from './scpi-templates.ts';
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
/** A new connection may stay silent for so long before it is given up: some are listened to only then. */
const patienceMs = 16_000;

export class ScpiAnalyzer implements Analyzer {
  readonly #answerTimeoutMs: number;
  readonly #operations: ScpiOperations;
  readonly #previous = new Map<SParameter, Float64Array>();
  #setup: SweepSetup | undefined;
  #sweep: InstrumentSweep | undefined;
  /** Correction as it was at the last `prepare`; a power cycle may lose it in silence. */
  #correctionOn: boolean | undefined;
  /** The sweep whose early end was found to be one. */
  #endProven: InstrumentSweep | undefined;
  #switchingOff: Promise<void> | undefined;

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
    this.#answerTimeoutMs = options.answerTimeoutMs ?? defaultAnswerTimeoutMs;
    this.#operations = new ScpiOperations(link, clock, {
      dialect: options.dialect,
      traceForm: { format: options.traceFormat, byteOrder: options.byteOrder },
      answerTimeoutMs: this.#answerTimeoutMs,
      onTraffic: options.onTraffic,
    });
  }

  /** Question and answer are known to belong together. */
  get inStep(): boolean {
    return this.#operations.inStep;
  }

  identify(signal?: AbortSignal): Promise<AnalyzerIdentity> {
    return this.#operations.run(signal, async (talk, stop) => {
      if (!this.inStep) return (await this.#operations.open(stop)).identity;
      const identity = await talk.askPlain('*IDN?', decodeIdentity);
      this.#operations.meet(identity, false);
      return identity;
    });
  }

  prepare(setup: SweepSetup, signal?: AbortSignal): Promise<PreparedSweep> {
    return this.#operations.run(signal, async (talk, stop) => {
      await this.#operations.bringInStep(stop);
      this.#setup = { ...setup, parameters: [...new Set(setup.parameters)] };
      this.#previous.clear();
      this.#correctionOn = undefined;
      const sweep = await this.#applySetup(talk);
      // Whatever was lost before: everything is set anew, and the caller sees what there is.
      this.#operations.known.forgetPowerCycle();
      return sweep;
    });
  }

  async acquire(parameters?: readonly SParameter[], signal?: AbortSignal): Promise<Acquisition> {
    const wanted = [...new Set(parameters ?? this.#setup?.parameters ?? [])];
    const strange = wanted.find((parameter) => !this.#setup?.parameters.includes(parameter));
    if (!this.#setup || strange) throw new Error(`defect: ${strange ?? 'a sweep'} was not prepared`);
    try {
      return await this.#operations.run(signal, (talk, stop) => this.#acquire(talk, stop, wanted));
    } catch (error) {
      // A refused start, an unfinished trace, a setting changed at the front panel: the setup is sent
      // again and one more sweep decides.
      if (!isCurable(error) && !wasChangedMeanwhile(error)) throw error;
      return this.#operations.run(signal, (talk, stop) => this.#acquire(talk, stop, wanted));
    }
  }

  source(on: boolean, signal?: AbortSignal): Promise<void> {
    if (!on) return this.#sourceOff();
    return this.#operations.run(signal, async (talk, stop) => {
      await this.#operations.bringInStep(stop);
      await talk.tell('output', { onOff: 'ON' });
      await talk.throwErrors('switching the source on');
      requireSetting('output', true, await talk.askBoolean('outputQuery'));
    });
  }

  calibrationState(signal?: AbortSignal): Promise<CalibrationState> {
    return this.#operations.run(signal, async (talk, stop) => {
      await this.#operations.bringInStep(stop);
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
    return this.#operations.run(signal, async (talk, stop) => {
      await this.#operations.open(stop, { patienceMs });
      if (this.#setup) await this.#applySetup(talk);
      this.#operations.known.tellOfPowerCycle();
    });
  }

  async close(): Promise<void> {
    // Switching off is the one thing that closing does not cut short; its caller hears how it went.
    await Promise.allSettled([this.#switchingOff]);
    await this.#operations.close();
  }

  async #acquire(
    talk: ScpiConversation,
    stop: AbortSignal,
    wanted: readonly SParameter[],
  ): Promise<Acquisition> {
    await this.#operations.bringInStep(stop);
    this.#operations.known.tellOfPowerCycle();
    const setup = this.#setup;
    const sweep = this.#operations.doubtful || !this.#sweep ? await this.#applySetup(talk) : this.#sweep;
    if (!setup) throw new Error('defect: nothing is prepared');
    const { statedEndMs, ...run } = await this.#runSweeps(talk, stop, sweep);
    const traces = await readTraces(talk, sweep, wanted);
    if (statedEndMs !== undefined && sweep !== this.#endProven) {
      await confirmEnd(talk, sweep, traces, statedEndMs);
      this.#endProven = sweep;
    }
    await confirmUnchanged(talk, setup, sweep);
    for (const [parameter, trace] of traces) {
      requirePlausible(parameter, trace, this.#previous.get(parameter));
      this.#previous.set(parameter, trace.slice());
    }
    return { ...run, traces };
  }

  async #runSweeps(talk: ScpiConversation, stop: AbortSignal, sweep: InstrumentSweep): Promise<SweepRun> {
    try {
      return await runSweeps(talk, sweep, this.#answerTimeoutMs);
    } catch (error) {
      // Whoever gave up waiting must not leave a sweep running; nothing is awaited of the instrument.
      if (stop.aborted) await this.#operations.shout('abort');
      throw error;
    }
  }

  async #applySetup(talk: ScpiConversation): Promise<InstrumentSweep> {
    if (!this.#setup) throw new Error('defect: nothing is prepared');
    this.#operations.doubtful = true;
    const sweep = await applySetup(talk, this.#setup);
    if (talk.has('correctionQuery')) {
      const correctionOn = await talk.askBoolean('correctionQuery');
      requireSetting('correction', this.#correctionOn ?? correctionOn, correctionOn);
      this.#correctionOn = correctionOn;
    }
    this.#sweep = sweep;
    this.#operations.doubtful = false;
    return sweep;
  }

  /** Two calls make one: the second must not overtake the first. */
  #sourceOff(): Promise<void> {
    const reason = new DriverError('ANALYZER_INTERRUPTED', 'switching the source off came first');
    this.#switchingOff ??= this.#operations.overtake(['output'], reason, confirmOff).finally(() => {
      this.#switchingOff = undefined;
    });
    return this.#switchingOff;
  }
}

async function confirmOff(talk: ScpiConversation): Promise<void> {
  await talk.tell('output', { onOff: 'OFF' });
  requireSetting('output', false, await talk.askBoolean('outputQuery'));
}

/** The grid was right when it was prepared and wrong after the sweep. */
function wasChangedMeanwhile(error: unknown): boolean {
  return isDriverError(error, 'ANALYZER_SETTING_DIFFERS') && error.facts['afterSweep'] === true;
}
