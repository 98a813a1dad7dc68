// The Analyzer over an instrument that answers a scan with a table (see scan-table-dialect.ts). What it cannot be
// asked is not assumed: settings are sent anew before every acquisition and read back where a question for them
// exists; every scan carries its own grid, and the frequency column, where there is one, proves it. Averages are
// made here, of as many scans.
import type { Clock } from '../../clock.ts';
import { DriverError } from '../../errors.ts';
import type { Link } from '../../link/link.ts';
import type {
  Acquisition,
  Analyzer,
  AnalyzerIdentity,
  CalibrationState,
  PreparedSweep,
  SParameter,
  SweepSetup,
} from '../analyzer.ts';
import { KnownInstrument } from '../known-instrument.ts';
import { OperationQueue } from '../operation-queue.ts';
import { linearGrid, requireAxis, requireSetting } from '../scpi-setup.ts';
import { fillTemplate, type Substitutions } from '../scpi-templates.ts';
import { decodeBoolean, decodeNumber, excerpt } from '../scpi-values.ts';
import type { TrafficNote } from '../scpi-wire.ts';
import { requirePlausible } from '../trace-checks.ts';
import {
  problemOfScanTemplate,
  problemsOfScanTable,
  type ScanTableDialect,
  type ScanTemplateName,
  scanTemplateNames,
  scanTemplateOf,
} from './scan-table-dialect.ts';
import { decodeTable, numberIn } from './table-text.ts';
import { TextSession } from './text-session.ts';

export interface ScanTableAnalyzerOptions {
  dialect: ScanTableDialect;
  answerTimeoutMs?: number;
  onTraffic?: (note: TrafficNote) => void;
}

const lineEnds = { lf: '\n', cr: '\r', crlf: '\r\n' } as const;
const defaultAnswerTimeoutMs = 3_000;
/** How much longer than estimated from the bandwidth a scan may stay silent. */
const scanSlackMs = 15_000;
const charsPerLine = 200;
const pollMs = 20;
const waitSlackMs = 100;
const bandwidthTolerance = 1e-3;
const powerToleranceDb = 0.01;

type Work<T> = (stop: AbortSignal) => Promise<T>;

export class ScanTableAnalyzer implements Analyzer {
  readonly #dialect: ScanTableDialect;
  readonly #clock: Clock;
  readonly #answerTimeoutMs: number;
  readonly #session: TextSession;
  readonly #queue = new OperationQueue();
  readonly #known = new KnownInstrument();
  readonly #previous = new Map<SParameter, Float64Array>();
  #identity: AnalyzerIdentity | undefined;
  #setup: SweepSetup | undefined;
  /** Correction as it was at the last `prepare`. */
  #correctionOn: boolean | undefined;

  /** Opens nothing. Throws ANALYZER_BAD_DIALECT. */
  constructor(link: Link, clock: Clock, options: ScanTableAnalyzerOptions) {
    const { dialect } = options;
    const missing = problemsOfScanTable(dialect).map((problem) => `it needs ${problem}`);
    const wrong = scanTemplateNames.flatMap((name) => {
      const template = dialect.templates[name];
      const problem = template === undefined ? undefined : problemOfScanTemplate(name, template);
      return problem === undefined ? [] : [`'${name}' ${problem}`];
    });
    const problems = [...missing, ...wrong].join('; ');
    if (problems !== '') {
      throw new DriverError('ANALYZER_BAD_DIALECT', `dialect scan-table: ${problems}`, {
        dialect: 'scan-table',
      });
    }
    this.#dialect = dialect;
    this.#answerTimeoutMs = options.answerTimeoutMs ?? defaultAnswerTimeoutMs;
    this.#clock = clock;
    this.#session = new TextSession(link, clock, {
      prompt: dialect.prompt,
      lineEnd: lineEnds[dialect.sendsLineEnd],
      answerTimeoutMs: this.#answerTimeoutMs,
      onTraffic: options.onTraffic,
    });
  }

  identify(signal?: AbortSignal): Promise<AnalyzerIdentity> {
    return this.#run(signal, async (stop) => {
      if (!this.#session.inStep || !this.#identity) return this.#open(stop);
      return this.#meet(await this.#ask('identityQuery', stop));
    });
  }

  prepare(setup: SweepSetup, signal?: AbortSignal): Promise<PreparedSweep> {
    return this.#run(signal, async (stop) => {
      await this.#bringInStep(stop);
      this.#previous.clear();
      this.#correctionOn = undefined;
      this.#setup = { ...setup, parameters: [...new Set(setup.parameters)] };
      for (const parameter of this.#setup.parameters) {
        if (this.#dialect.templates[scanTemplateOf(parameter)] !== undefined) continue;
        throw new DriverError(
          'ANALYZER_BAD_DIALECT',
          `${parameter} is to be measured, and the dialect has no '${scanTemplateOf(parameter)}'`,
          { parameter },
        );
      }
      return this.#applySetup(this.#setup, stop);
    });
  }

  acquire(parameters?: readonly SParameter[], signal?: AbortSignal): Promise<Acquisition> {
    return this.#run(signal, async (stop) => {
      const setup = this.#setup;
      const wanted = [...new Set(parameters ?? setup?.parameters ?? [])];
      if (!setup || wanted.some((each) => !setup.parameters.includes(each))) {
        throw new Error('defect: what is to be acquired was not prepared');
      }
      await this.#bringInStep(stop);
      const prepared = await this.#applySetup(setup, stop);
      return this.#scanAll(setup, prepared, wanted, stop);
    });
  }

  source(on: boolean, signal?: AbortSignal): Promise<void> {
    if (!on) return this.#sourceOff();
    return this.#run(signal, async (stop) => {
      await this.#bringInStep(stop);
      await this.#switch('ON', stop);
    });
  }

  calibrationState(signal?: AbortSignal): Promise<CalibrationState> {
    return this.#run(signal, async (stop) => {
      await this.#bringInStep(stop);
      return { correctionOn: (await this.#askCorrection(stop)) ?? false };
    });
  }

  recover(signal?: AbortSignal): Promise<void> {
    return this.#run(signal, async (stop) => {
      await this.#open(stop);
      if (this.#setup) await this.#applySetup(this.#setup, stop);
    });
  }

  async close(): Promise<void> {
    this.#queue.interrupt(new DriverError('ANALYZER_INTERRUPTED', 'the analyzer was closed'));
    await this.#queue.run(() => this.#session.close());
  }

  /** In its turn; a session that has lost its step by a failure is opened anew, once. */
  #run<T>(signal: AbortSignal | undefined, work: Work<T>): Promise<T> {
    return this.#queue.run(async (stop) => {
      try {
        return await work(stop);
      } catch (error) {
        if (stop.aborted) throw stop.reason;
        if (!(error instanceof DriverError) || this.#session.inStep || !this.#session.isOpen) throw error;
        await this.#openAfter(error, stop);
        throw error;
      }
    }, signal);
  }

  async #openAfter(error: DriverError, stop: AbortSignal): Promise<void> {
    try {
      await this.#open(stop);
    } catch (second) {
      if (stop.aborted) throw stop.reason;
      const because = second instanceof Error ? second.message : String(second);
      const message = `${error.message}; the session is still out of step: ${because}`;
      throw new DriverError(error.code, message, { ...error.facts, inStep: false }, error);
    }
  }

  async #bringInStep(stop: AbortSignal): Promise<void> {
    if (!this.#session.inStep) await this.#open(stop);
  }

  async #open(stop: AbortSignal, urgent: readonly string[] = []): Promise<AnalyzerIdentity> {
    const question = this.#message('identityQuery');
    const scanMs = this.#setup ? 1.5 * estimatedScanMs(this.#setup) : 0;
    const timeoutMs = this.#answerTimeoutMs + scanMs;
    return this.#meet(await this.#session.resynchronize(question, { urgent, timeoutMs, signal: stop }));
  }

  #meet(lines: readonly string[]): AnalyzerIdentity {
    const answer = excerpt(lines.join(' '));
    const { identity = answer } = this.#dialect;
    // The answer counts as the serial number: were it another one, it would be another instrument.
    const met = { maker: 'not told', model: identity, serial: answer, firmware: 'not told' };
    try {
      this.#known.meet(met, false);
    } catch (error) {
      this.#session.distrust('another instrument answers');
      throw error;
    }
    this.#identity = met;
    return met;
  }

  async #applySetup(setup: SweepSetup, stop: AbortSignal): Promise<PreparedSweep> {
    const { fixed } = this.#dialect;
    const { ifBandwidthHz, powerDbm, startHz, stopHz, points, averages, parameters } = setup;
    const tolerance = ifBandwidthHz * bandwidthTolerance;
    requireSetting('IF bandwidth (Hz)', ifBandwidthHz, fixed.ifBandwidthHz ?? ifBandwidthHz, tolerance);
    requireSetting('power (dBm)', powerDbm, fixed.powerDbm ?? powerDbm, powerToleranceDb);
    const gotHz = await this.#set('ifBandwidth', ifBandwidthHz, stop);
    requireSetting('IF bandwidth (Hz)', ifBandwidthHz, gotHz, tolerance);
    const gotDbm = await this.#set('power', powerDbm, stop);
    requireSetting('power (dBm)', powerDbm, gotDbm, powerToleranceDb);
    const correctionOn = await this.#askCorrection(stop);
    if (correctionOn !== undefined) {
      requireSetting('correction', this.#correctionOn ?? correctionOn, correctionOn);
      this.#correctionOn = correctionOn;
    }
    return {
      frequenciesHz: linearGrid(startHz, stopHz, points),
      ifBandwidthHz: gotHz,
      powerDbm: gotDbm,
      averages,
      parameters,
      acquisitionMs: estimatedScanMs(setup) * averages * parameters.length,
    };
  }

  /** Sends a setting; returns what the instrument says it has, or what was sent where it cannot be asked. */
  async #set(name: 'ifBandwidth' | 'power', value: number, stop: AbortSignal): Promise<number> {
    await this.#tell(name, { value }, stop);
    if (this.#dialect.templates[`${name}Query`] === undefined) return value;
    const lines = await this.#ask(`${name}Query`, stop);
    return this.#decoded(() => numberIn(lines));
  }

  async #askCorrection(stop: AbortSignal): Promise<boolean | undefined> {
    const { templates, correctionOnSays } = this.#dialect;
    if (templates.correctionQuery === undefined || correctionOnSays === undefined) return undefined;
    return (await this.#ask('correctionQuery', stop)).join(' ').includes(correctionOnSays);
  }

  async #scanAll(
    setup: SweepSetup,
    { frequenciesHz }: PreparedSweep,
    wanted: readonly SParameter[],
    stop: AbortSignal,
  ): Promise<Acquisition> {
    const startMonotonicMs = this.#clock.monotonicMs();
    const traces = new Map<SParameter, Float64Array>();
    for (let scan = 0; scan < setup.averages; scan += 1) {
      for (const parameter of wanted) {
        const one = await this.#scan(setup, frequenciesHz, parameter, stop);
        requirePlausible(parameter, one, this.#previous.get(parameter));
        this.#previous.set(parameter, one);
        const sum = traces.get(parameter) ?? new Float64Array(one.length);
        traces.set(
          parameter,
          sum.map((value, i) => value + one[i]! / setup.averages),
        );
      }
    }
    const stopMonotonicMs = this.#clock.monotonicMs();
    // Several scans, and the time of their tables: a point's own moment is known no better than this.
    const middleMs = (stopMonotonicMs - startMonotonicMs) / 2;
    const timeLaw = { kind: 'linear', firstMs: middleMs, lastMs: middleMs } as const;
    return { startMonotonicMs, stopMonotonicMs, timeLaw, traces };
  }

  async #scan(
    setup: SweepSetup,
    frequenciesHz: Float64Array,
    parameter: SParameter,
    stop: AbortSignal,
  ): Promise<Float64Array> {
    const { startHz, stopHz, points, ifBandwidthHz, powerDbm } = setup;
    const values = { start: startHz, stop: stopHz, points, ifBandwidth: ifBandwidthHz, power: powerDbm };
    const messages = fillTemplate(this.#dialect.templates[scanTemplateOf(parameter)] ?? [], values);
    for (const message of messages.slice(0, -1)) await this.#tellMessage(message, stop);
    await this.#awaitEnd(setup, stop);
    const lines = await this.#session.ask({
      message: messages.at(-1) ?? '',
      lines: points,
      timeoutMs: 1.5 * estimatedScanMs(setup) + scanSlackMs,
      maxChars: charsPerLine * (points + 2),
      signal: stop,
    });
    const trace = this.#decoded(() => decodeTable(lines, this.#dialect.columns, frequenciesHz));
    await this.#confirmAxis(frequenciesHz, stop);
    return trace;
  }

  /** For scans that only begin one: the end as the description says. Throws ANALYZER_SWEEP_TIMEOUT. */
  async #awaitEnd(setup: SweepSetup, stop: AbortSignal): Promise<void> {
    const { completion } = this.#dialect;
    if (!completion) return;
    const expectedMs = estimatedScanMs(setup);
    if (completion.by === 'wait')
      return this.#clock.sleep(expectedMs * completion.factor + waitSlackMs, stop);
    const allowedMs = 1.5 * expectedMs + scanSlackMs;
    const deadlineMs = this.#clock.monotonicMs() + allowedMs;
    while (this.#clock.monotonicMs() < deadlineMs) {
      await this.#clock.sleep(pollMs, stop);
      const lines = await this.#session.ask({ message: completion.query, lines: 1, signal: stop });
      if (lines.join(' ') === completion.until.trim()) return;
    }
    throw new DriverError(
      'ANALYZER_SWEEP_TIMEOUT',
      `'${completion.query}' was not answered with '${completion.until}' within ${Math.round(allowedMs)} ms`,
      { allowedMs: Math.round(allowedMs) },
    );
  }

  /** Where the table has no frequencies. Throws ANALYZER_SETTING_DIFFERS. */
  async #confirmAxis(frequenciesHz: Float64Array, stop: AbortSignal): Promise<void> {
    const { columns, templates } = this.#dialect;
    if (columns.includes('frequency') || templates.frequencyQuery === undefined) return;
    const points = frequenciesHz.length;
    const lines = await this.#session.ask({
      message: this.#message('frequencyQuery'),
      lines: points,
      maxChars: charsPerLine * (points + 2),
      signal: stop,
    });
    this.#decoded(() => {
      if (lines.length !== points) {
        throw new DriverError('ANALYZER_BAD_ANSWER', `${lines.length} frequencies instead of ${points}`);
      }
      requireAxis(frequenciesHz, Float64Array.from(lines, decodeNumber));
    });
  }

  /** An answer of another form than asked for may be that to another question. */
  #decoded<T>(decode: () => T): T {
    try {
      return decode();
    } catch (error) {
      this.#session.distrust('an answer has another form than asked for');
      throw error;
    }
  }

  async #sourceOff(): Promise<void> {
    const reason = new DriverError('ANALYZER_INTERRUPTED', 'switching the source off came first');
    const urgent = (['abort', 'output'] as const)
      .filter((name) => this.#dialect.templates[name] !== undefined)
      .map((name) => this.#message(name, { onOff: 'OFF' }));
    const isBusy = this.#queue.isBusy;
    if (isBusy && this.#session.isOpen) {
      // What cannot be sent is found out below, where step and output are proven.
      await Promise.allSettled(urgent.map((message) => this.#session.shout(message)));
    }
    this.#queue.interrupt(reason);
    return this.#queue.run(async (stop) => {
      // An instrument that answers is not scanning: without a switch this is the proof that nothing is radiated.
      if (this.#session.inStep && !isBusy) await this.#ask('identityQuery', stop);
      else await this.#open(stop, urgent);
      await this.#switch('OFF', stop);
    });
  }

  async #switch(onOff: 'ON' | 'OFF', stop: AbortSignal): Promise<void> {
    await this.#tell('output', { onOff }, stop);
    if (this.#dialect.templates.outputQuery === undefined) return;
    const lines = await this.#ask('outputQuery', stop);
    const word = lines.join(' ').trim().split(/\s+/).at(-1) ?? '';
    requireSetting(
      'output',
      onOff === 'ON',
      this.#decoded(() => decodeBoolean(word)),
    );
  }

  /** A setting; one that the dialect does not have is left out. What it is answered with is a refusal. */
  async #tell(name: ScanTemplateName, values: Substitutions, stop: AbortSignal): Promise<void> {
    if (this.#dialect.templates[name] === undefined) return;
    await this.#tellMessage(this.#message(name, values), stop);
  }

  async #tellMessage(message: string, stop: AbortSignal): Promise<void> {
    const lines = await this.#session.ask({ message, lines: 0, signal: stop });
    if (lines.length === 0) return;
    const answer = excerpt(lines.join(' '));
    throw new DriverError('ANALYZER_COMMAND_REFUSED', `'${message}' was answered with '${answer}'`, {
      message,
      answer,
    });
  }

  #ask(name: ScanTemplateName, stop: AbortSignal): Promise<string[]> {
    return this.#session.ask({ message: this.#message(name), lines: 1, signal: stop });
  }

  #message(name: ScanTemplateName, values: Substitutions = {}): string {
    const [message] = fillTemplate(this.#dialect.templates[name] ?? [], values);
    return message ?? '';
  }
}

function estimatedScanMs({ points, ifBandwidthHz }: SweepSetup): number {
  return points * (1 + 2000 / ifBandwidthHz);
}
