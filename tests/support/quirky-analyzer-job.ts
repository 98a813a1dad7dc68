// The whole job of the analyzer driver against a quirky instrument, in simulated time: identify, prepare, source
// on, many acquisitions with trouble in between, source off, close. Every outcome is judged against what the
// instrument knows of itself: the right thing, or a typed error, and neither later than a bound.
import type { Acquisition, SParameter, SweepSetup } from '../../drivers/analyzer/analyzer.ts';
import { ScpiAnalyzer, type ScpiAnalyzerOptions } from '../../drivers/analyzer/scpi-analyzer.ts';
import { dialectNamed } from '../../drivers/analyzer/scpi-dialects.ts';
import { DriverError } from '../../drivers/errors.ts';
import { MemoryPort } from '../../drivers/link/memory.ts';
import { SimulatedClock } from '../../mocks/simulated-clock.ts';
import { QuirkyInstrument, type SweepRecord, truthOf } from './quirky-instrument.ts';
import type { InstrumentQuirks } from './quirky-instrument-habits.ts';

export type Trouble =
  | 'none'
  | 'drop-link'
  | 'cut-power'
  | 'touch-points'
  | 'touch-continuous'
  | 'touch-select'
  | 'touch-start'
  | 'chatter';

export interface AnalyzerJob {
  quirks: Partial<InstrumentQuirks>;
  setup?: Partial<SweepSetup>;
  traceFormat?: ScpiAnalyzerOptions['traceFormat'];
  byteOrder?: ScpiAnalyzerOptions['byteOrder'];
  /** What happens right before each acquisition; its length is their number. */
  troubles?: readonly Trouble[];
}

export interface JobOutcome {
  instrument: QuirkyInstrument;
  /** Failures by step, in order: `prepare: ANALYZER_COMMAND_REFUSED`. */
  failures: string[];
  errors: DriverError[];
  acquired: number;
}

const setupOf = (job: AnalyzerJob): SweepSetup => ({
  startHz: 800e6,
  stopHz: 900e6,
  points: 11,
  ifBandwidthHz: 1000,
  powerDbm: -10,
  averages: 1,
  parameters: ['S11', 'S21'],
  ...job.setup,
});

/** No step of the job takes longer, whatever the quirks: a few silences of 3 s, two setups, two sweeps and a half. */
const stepMs = 120_000;

export async function runAnalyzerJob(job: AnalyzerJob): Promise<JobOutcome> {
  const clock = new SimulatedClock();
  const port = new MemoryPort(clock, 'memory://quirky', { latencyMs: 1 });
  const instrument = new QuirkyInstrument(clock, job.quirks);
  instrument.serve(port);
  const analyzer = new ScpiAnalyzer(port.link(), clock, {
    dialect: dialectNamed('numbered-parameter'),
    traceFormat: job.traceFormat ?? 'real64',
    byteOrder: job.byteOrder ?? 'normal',
  });
  const setup = setupOf(job);
  const outcome: JobOutcome = { instrument, failures: [], errors: [], acquired: 0 };

  /** Runs one step; a failure must be typed, and neither outcome may take for ever. */
  const step = async <T>(name: string, work: () => Promise<T>): Promise<T | undefined> => {
    const begunMs = clock.monotonicMs();
    const timely = (): void => {
      const tookMs = clock.monotonicMs() - begunMs;
      if (tookMs > stepMs) throw new Error(`${name} took ${tookMs} ms`);
    };
    try {
      return await clock.run(work().finally(timely));
    } catch (error) {
      if (!(error instanceof DriverError)) throw error;
      if (error.message.length < 10) throw new Error(`${name}: '${error.message}' tells nothing`);
      outcome.failures.push(`${name}: ${error.code}`);
      outcome.errors.push(error);
      return undefined;
    }
  };

  const prepare = async (): Promise<boolean> => {
    const sweep = await step('prepare', () => analyzer.prepare(setup));
    if (!sweep) return false;
    requireSame('prepared', settingsOf(setup), { ...instrument.settings, averages: 0, averaging: false });
    const { startHz, stopHz } = instrument.settings;
    requireSame(
      'axis',
      [startHz, stopHz, setup.points],
      [sweep.frequenciesHz[0], sweep.frequenciesHz.at(-1), sweep.frequenciesHz.length],
    );
    return true;
  };

  const identity = await step('identify', () => analyzer.identify());
  if (identity)
    requireSame(
      'identity',
      `${identity.maker},${identity.model},${identity.serial},${identity.firmware}`,
      instrument.quirks.identity,
    );
  if (!(await prepare())) await prepare();
  if ((await step('source on', () => analyzer.source(true).then(done))) && !instrument.output)
    throw new Error('the source was said to be on');
  const troubles = job.troubles ?? ['none', 'none', 'none'];
  for (const trouble of troubles) {
    cause(instrument, trouble);
    if (trouble !== 'none') await clock.run(clock.sleep(5));
    const fromMs = clock.monotonicMs();
    const acquisition = await step('acquire', () => analyzer.acquire(wantedOf(setup)).catch(asTyped));
    if (acquisition) {
      requireTruth(instrument, setup, acquisition, fromMs, job.traceFormat ?? 'real64');
      outcome.acquired += 1;
      continue;
    }
    for (let tried = 0; tried < 12; tried += 1) {
      if (await step('recover', () => analyzer.recover().then(done))) break;
      await clock.run(clock.sleep(10_000));
    }
  }
  if (await step('source off', () => analyzer.source(false).then(done))) {
    if (instrument.output) throw new Error('the source was said to be off');
  }
  await step('close', () => analyzer.close());
  // Nothing may go on after the end: no reconnection, no question.
  const visits = instrument.visits;
  await clock.run(clock.sleep(60_000));
  requireSame('visits after the end', visits, instrument.visits);
  return outcome;
}

const done = (): boolean => true;

function wantedOf(setup: SweepSetup): readonly SParameter[] {
  return setup.parameters;
}

/** Sweeping what was never prepared is a bug of the caller, which this job commits on purpose. */
function asTyped(error: unknown): never {
  if (error instanceof Error && error.message.includes('was not prepared'))
    throw new DriverError('ANALYZER_INTERRUPTED', 'nothing was prepared', {});
  throw error;
}

function cause(instrument: QuirkyInstrument, trouble: Trouble): void {
  if (trouble === 'drop-link') instrument.dropLink();
  else if (trouble === 'cut-power') instrument.cutPower();
  else if (trouble === 'touch-points') instrument.touch({ points: 21 });
  else if (trouble === 'touch-continuous') instrument.touch({ continuous: true });
  else if (trouble === 'touch-select') instrument.touch({ select: 2 });
  else if (trouble === 'touch-start') instrument.touch({ startHz: 790e6 });
  else if (trouble === 'chatter') instrument.say('+1\n');
}

function settingsOf(setup: SweepSetup): object {
  const { startHz, stopHz, points, ifBandwidthHz: band, powerDbm: power } = setup;
  return { startHz, stopHz, points, band, power, averages: 0, averaging: false };
}

/** The traces are those of one sweep that began and ended within the acquisition, with the settings asked for. */
function requireTruth(
  instrument: QuirkyInstrument,
  setup: SweepSetup,
  acquisition: Acquisition,
  fromMs: number,
  format: ScpiAnalyzerOptions['traceFormat'],
): void {
  const tolerance = format === 'real32' ? 1e-7 : 1e-12;
  const sweep = instrument.sweeps.find((each) => isOf(each, acquisition, tolerance));
  if (!sweep) throw new Error('the traces belong to no sweep of the instrument');
  if (sweep.startedMs < fromMs || sweep.endedMs === undefined)
    throw new Error(`the traces are of old sweep ${sweep.id}`);
  if (sweep.averaged < setup.averages) throw new Error(`${sweep.averaged} of ${setup.averages} averages`);
  requireSame('settings of the sweep', settingsOf(setup), {
    ...sweep.settings,
    averages: 0,
    averaging: false,
  });
  requireSame('parameters read', [...acquisition.traces.keys()], wantedOf(setup));
  if (acquisition.stopMonotonicMs < sweep.endedMs) throw new Error('the sweep had not ended');
  if (acquisition.startMonotonicMs > sweep.startedMs)
    throw new Error('the sweep began before its stated start');
}

function isOf(sweep: SweepRecord, { traces }: Acquisition, tolerance: number): boolean {
  for (const [parameter, trace] of traces) {
    for (let index = 0; index < trace.length / 2; index += 1) {
      const [re, im] = truthOf(sweep, parameter, index);
      if (Math.abs(trace[2 * index]! - re) > tolerance || Math.abs(trace[2 * index + 1]! - im) > tolerance)
        return false;
    }
  }
  return true;
}

function requireSame(what: string, wanted: unknown, got: unknown): void {
  if (JSON.stringify(wanted) !== JSON.stringify(got))
    throw new Error(`${what}: ${JSON.stringify(wanted)} and not ${JSON.stringify(got)}`);
}
