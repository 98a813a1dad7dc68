// A ScpiAnalyzer and a scripted instrument on a wire in memory, in simulated time; for unit tests.
import type { SweepSetup } from '../../drivers/analyzer/analyzer.ts';
import { ScpiAnalyzer, type ScpiAnalyzerOptions } from '../../drivers/analyzer/scpi-analyzer.ts';
import { dialectNamed } from '../../drivers/analyzer/scpi-dialects.ts';
import { MemoryPort, type MemoryPortOptions } from '../../drivers/link/memory.ts';
import { SimulatedClock } from '../../mocks/simulated-clock.ts';
import { ScriptedInstrument, type ScriptedOptions } from './scripted-instrument.ts';

export const sampleSetup: SweepSetup = {
  startHz: 800e6,
  stopHz: 900e6,
  points: 5,
  ifBandwidthHz: 1000,
  powerDbm: -10,
  averages: 1,
  parameters: ['S11', 'S21'],
};

export interface AnalyzerBenchOptions {
  instrument?: ScriptedOptions;
  wire?: MemoryPortOptions;
  analyzer?: Partial<ScpiAnalyzerOptions>;
}

export function analyzerBench(options: AnalyzerBenchOptions = {}) {
  const clock = new SimulatedClock();
  const port = new MemoryPort(clock, 'memory://analyzer', { latencyMs: 1, ...options.wire });
  const instrument = new ScriptedInstrument(clock, options.instrument);
  const listener = port.listen(instrument.accept);
  const link = port.link();
  const analyzer = new ScpiAnalyzer(link, clock, {
    dialect: dialectNamed('numbered-parameter'),
    traceFormat: 'real64',
    byteOrder: 'normal',
    ...options.analyzer,
  });
  return { clock, port, listener, link, instrument, analyzer };
}

export type AnalyzerBench = ReturnType<typeof analyzerBench>;

/** The same, identified and prepared. */
export async function preparedBench(
  options: AnalyzerBenchOptions & { setup?: Partial<SweepSetup> } = {},
): Promise<AnalyzerBench> {
  const bench = analyzerBench(options);
  await bench.clock.run(bench.analyzer.identify());
  await bench.clock.run(bench.analyzer.prepare({ ...sampleSetup, ...options.setup }));
  bench.instrument.heard.length = 0;
  return bench;
}

/** The error that `work` ends with, for looking at its code and facts. */
export async function failureOf(work: Promise<unknown>): Promise<Error> {
  try {
    await work;
  } catch (error) {
    return error as Error;
  }
  throw new Error('it should have failed, and did not');
}
