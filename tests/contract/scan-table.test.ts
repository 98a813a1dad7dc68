// An analyzer with a command tree of its own, described in a range file alone: what Analyzer promises is kept as
// far as such an instrument can be asked, and whatever strikes ends in a typed error or a true trace.
import { afterEach, describe, expect, it } from 'vitest';
import type { Analyzer, SweepSetup } from '../../drivers/analyzer/analyzer.ts';
import { ScanTableAnalyzer } from '../../drivers/analyzer/scan-table/scan-table-analyzer.ts';
import type { ScanTableDialect } from '../../drivers/analyzer/scan-table/scan-table-dialect.ts';
import { DriverError } from '../../drivers/errors.ts';
import { MemoryPort, type MemoryPortOptions } from '../../drivers/link/memory.ts';
import { measureScene } from '../../mocks/analyzer/measure-scene.ts';
import { ScanConsole } from '../../mocks/analyzer-private/scan-console.ts';
import { Scene } from '../../mocks/scene/scene.ts';
import { SimulatedClock } from '../../mocks/simulated-clock.ts';
import { ConsoleRange } from '../support/console-range.ts';

const dialect: ScanTableDialect = {
  base: 'scan-table',
  identity: 'bench console',
  prompt: 'ok>',
  sendsLineEnd: 'cr',
  columns: ['frequency', 're', 'im'],
  source: 'only-while-scanning',
  fixed: { powerDbm: -7 },
  templates: {
    identityQuery: ['version'],
    ifBandwidth: ['bandwidth {value}'],
    ifBandwidthQuery: ['bandwidth'],
    scanS21: ['scan {start} {stop} {points} 5'],
    scanS11: ['scan {start} {stop} {points} 3'],
  },
};

const setup: SweepSetup = {
  startHz: 820e6,
  stopHz: 920e6,
  points: 11,
  ifBandwidthHz: 1000,
  powerDbm: -7,
  averages: 1,
  parameters: ['S21', 'S11'],
};

const pose = { azimuthDeg: 20, elevationDeg: -5, rollDeg: 0 };

function consoleBench(wire: MemoryPortOptions = {}, own: Partial<ScanTableDialect> = {}) {
  const clock = new SimulatedClock();
  const scene = new Scene({ noise: { snrDb: 130, reflectionSnrDb: 130 } });
  const instrument = new ScanConsole({ clock, measure: measureScene(scene, () => pose) });
  const port = new MemoryPort(clock, 'memory://console', { latencyMs: 1, ...wire });
  port.listen((visitor) => instrument.accept(visitor));
  const analyzer = new ScanTableAnalyzer(port.link(), clock, { dialect: { ...dialect, ...own } });
  return { clock, scene, instrument, port, analyzer };
}

type ConsoleBench = ReturnType<typeof consoleBench>;

async function failureOf({ clock }: ConsoleBench, work: Promise<unknown>): Promise<DriverError> {
  const outcome = await clock.run(work.catch((error: unknown) => error));
  expect(outcome).toBeInstanceOf(DriverError);
  return outcome as DriverError;
}

/** Every point is the scene's: noise lies 130 dB below, a number is printed with nine decimals. */
async function expectScene(
  { clock, scene, analyzer }: ConsoleBench,
  parameters?: readonly ['S21'],
): Promise<void> {
  const { traces } = await clock.run(analyzer.acquire(parameters));
  expect([...traces.keys()]).toEqual(parameters ?? setup.parameters);
  for (const [parameter, trace] of traces) {
    for (let k = 0; k < setup.points; k += 1) {
      const wanted = scene.s(parameter, 820e6 + 10e6 * k, clock.monotonicMs(), pose);
      const off = Math.hypot(trace[2 * k]! - wanted.re, trace[2 * k + 1]! - wanted.im);
      expect(off, `${parameter} point ${k + 1}`).toBeLessThan(1e-5);
    }
  }
}

async function prepared(
  wire: MemoryPortOptions = {},
  own: Partial<ScanTableDialect> = {},
): Promise<ConsoleBench> {
  const bench = consoleBench(wire, own);
  await bench.clock.run(bench.analyzer.identify());
  await bench.clock.run(bench.analyzer.prepare(setup));
  return bench;
}

describe('an analyzer with a command tree of its own', () => {
  it('says who it is', async () => {
    const { clock, analyzer } = consoleBench();
    const identity = { model: 'bench console', serial: 'BENCH-SCAN 1.3 board 0007' };
    expect(await clock.run(analyzer.identify())).toMatchObject(identity);
    expect(await clock.run(analyzer.identify())).toMatchObject(identity);
  });

  it.each([
    ['whole', {}],
    ['byte by byte', { cut: (bytes: Uint8Array) => Array.from(bytes, (byte) => Uint8Array.of(byte)) }],
  ])('reads the scene, its answers %s', async (_, wire) => {
    const bench = await prepared(wire);
    await expectScene(bench);
    await expectScene(bench, ['S21']);
  });

  it('averages scans by itself', async () => {
    const bench = consoleBench();
    const { clock, analyzer } = bench;
    await clock.run(analyzer.identify());
    await clock.run(analyzer.prepare({ ...setup, averages: 4, parameters: ['S21'] }));
    let scans = 0;
    bench.instrument.faults.onPrint = (text, line) => {
      if (line.startsWith('scan')) scans += 1;
      return text;
    };
    await expectScene(bench, ['S21']);
    expect(scans).toBe(4);
  });

  it('refuses what the instrument does not have', async () => {
    const bench = await prepared();
    const refused = await failureOf(bench, bench.analyzer.prepare({ ...setup, ifBandwidthHz: 1234 }));
    expect(refused.code).toBe('ANALYZER_COMMAND_REFUSED');
    const other = await failureOf(bench, bench.analyzer.prepare({ ...setup, powerDbm: 0 }));
    expect(other).toMatchObject({ code: 'ANALYZER_SETTING_DIFFERS', facts: { asked: 0, got: -7 } });
    const port2 = await failureOf(bench, bench.analyzer.prepare({ ...setup, parameters: ['S22'] }));
    expect(port2.code).toBe('ANALYZER_BAD_DIALECT');
    await bench.clock.run(bench.analyzer.prepare(setup));
    await expectScene(bench);
  });

  it('refuses a setting that was not taken over', async () => {
    const bench = await prepared();
    bench.instrument.faults.onPrint = (text) => text.replace('bandwidth 1000 Hz', 'bandwidth 300 Hz');
    const failure = await failureOf(bench, bench.analyzer.acquire());
    expect(failure).toMatchObject({ code: 'ANALYZER_SETTING_DIFFERS', facts: { asked: 1000, got: 300 } });
  });

  it('proves the grid by the frequency column', async () => {
    const bench = await prepared();
    bench.instrument.faults.onPrint = (text) => text.replace('\n850000000 ', '\n850100000 ');
    const failure = await failureOf(bench, bench.analyzer.acquire());
    expect(failure).toMatchObject({ code: 'ANALYZER_SETTING_DIFFERS', facts: { got: 850100000 } });
    bench.instrument.faults = {};
    await expectScene(bench);
  });

  it.each([
    ['a line is missing', (text: string) => text.replace(/\n840000000[^\n]*/, '')],
    ['a line is too many', (text: string) => text.replace('ok> ', '930000000 0.1 0.1\r\nok> ')],
    ['a number is missing', (text: string) => text.replace(/\n(840000000 \S+)[^\n]*/, '\n$1\r')],
    ['a number is none', (text: string) => text.replace(/\n840000000 \S+/, '\n840000000 x')],
    ['it complains', () => 'scan 1 2 3 5\r\nno lock\r\nok> '],
    ['it is silent', () => undefined],
    ['its end is missing', (text: string) => text.slice(0, -20)],
  ])('never takes a spoiled table for a trace: %s', async (_, spoil) => {
    const bench = await prepared();
    bench.instrument.faults.onPrint = (text, line) => (line.startsWith('scan') ? spoil(text) : text);
    const lines: string[] = [];
    const spoiled = bench.instrument.faults.onPrint;
    bench.instrument.faults.onPrint = (text, line) => {
      lines.push(line);
      return spoiled(text, line);
    };
    const { code } = await failureOf(bench, bench.analyzer.acquire());
    // What cannot be read may be the answer to another question: step is proven anew.
    expect(lines.slice(-2)).toEqual(['version', 'version']);
    expect(['ANALYZER_BAD_ANSWER', 'ANALYZER_NOT_ANSWERING']).toContain(code);
    bench.instrument.faults = {};
    await expectScene(bench);
  });

  it('finds back into step when text comes that nobody asked for', async () => {
    const bench = await prepared();
    bench.instrument.faults.onPrint = (text, line) =>
      line === 'bandwidth' ? `${text}\r\nlock lost\r\nok> ` : text;
    await bench.clock.run(bench.analyzer.acquire().catch(() => {}));
    bench.instrument.faults = {};
    await expectScene(bench);
  });

  it('tells a repeated table from a new one', async () => {
    const bench = await prepared();
    let first: string | undefined;
    bench.instrument.faults.onPrint = (text, line) => {
      if (!line.endsWith(' 5')) return text;
      first ??= text;
      return first;
    };
    await expectScene(bench, ['S21']);
    const { code, facts } = await failureOf(bench, bench.analyzer.acquire(['S21']));
    expect([code, facts['frozen']]).toEqual(['ANALYZER_IMPLAUSIBLE_DATA', true]);
  });

  it('sets everything anew after a power cycle', async () => {
    const bench = await prepared();
    await expectScene(bench);
    await bench.clock.run(bench.instrument.powerCycle());
    expect(bench.instrument.state.bandwidthHz).toBe(4000);
    await bench.clock.run(bench.analyzer.recover());
    await expectScene(bench);
    expect(bench.instrument.state.bandwidthHz).toBe(1000);
  });

  it('notices another instrument in its place', async () => {
    const bench = await prepared();
    bench.instrument.faults.onPrint = (text) => text.replace('board 0007', 'board 0008');
    const { code } = await failureOf(bench, bench.analyzer.recover());
    expect(code).toBe('ANALYZER_IDENTITY_CHANGED');
    expect((await failureOf(bench, bench.analyzer.acquire())).code).toBe('ANALYZER_IDENTITY_CHANGED');
  });

  it('is not switched off before the scan is over: then nothing is radiated', async () => {
    const bench = await prepared();
    const { clock, analyzer, instrument } = bench;
    const scanning = analyzer.acquire();
    scanning.catch(() => {});
    while (!instrument.isScanning) await clock.run(clock.sleep(1));
    await clock.run(clock.sleep(5));
    expect(instrument.isScanning).toBe(true);
    await clock.run(analyzer.source(false));
    expect(instrument.isScanning).toBe(false);
    expect((await failureOf(bench, scanning)).code).toBe('ANALYZER_INTERRUPTED');
    await expectScene(bench);
  });

  it('is waited for until a long scan is over, before the source counts as off', async () => {
    const bench = await prepared();
    const { clock, analyzer, instrument } = bench;
    await clock.run(analyzer.prepare({ ...setup, points: 401, ifBandwidthHz: 100 }));
    const scanning = analyzer.acquire();
    scanning.catch(() => {});
    await clock.run(clock.sleep(100));
    expect(instrument.isScanning).toBe(true);
    const begunMs = clock.monotonicMs();
    await clock.run(analyzer.source(false));
    expect(instrument.isScanning).toBe(false);
    // 401 points of 10.1 ms.
    expect(clock.monotonicMs() - begunMs).toBeGreaterThan(3900);
    expect((await failureOf(bench, scanning)).code).toBe('ANALYZER_INTERRUPTED');
  });

  it('gives up when its caller does', async () => {
    const bench = await prepared();
    const patience = new AbortController();
    const given = bench.analyzer.acquire(undefined, patience.signal).catch((error: unknown) => error);
    await bench.clock.run(bench.clock.sleep(8));
    const reason = new Error('enough');
    patience.abort(reason);
    expect(await bench.clock.run(given)).toBe(reason);
    await expectScene(bench);
  });

  it('is refused a description it cannot be driven by', () => {
    const without = { ...dialect, templates: { ...dialect.templates, scanS11: ['scan {start};reboot'] } };
    const { clock, port } = consoleBench();
    const make = (): Analyzer => new ScanTableAnalyzer(port.link(), clock, { dialect: without });
    expect(make).toThrow(expect.objectContaining({ code: 'ANALYZER_BAD_DIALECT' }));
  });
});

type Strike = (bench: ConsoleBench, text: string) => string | undefined | Promise<string | undefined>;

const strikes: [string, Strike][] = [
  ['silence', () => undefined],
  ['garbage', () => 'x\x00\x7f?? 1 2\r\nok> '],
  ['a lone prompt', () => 'ok> '],
  ['half of it', (_, text) => text.slice(0, text.length / 2)],
  ['twice of it', (_, text) => text + text],
  ['a boot text in front', (_, text) => `boot 1.0\r\nok> ${text}`],
  [
    'much later',
    async ({ clock }, text) => {
      await clock.sleep(20_000);
      return text;
    },
  ],
  [
    'with a power cut',
    async ({ instrument }) => {
      await instrument.powerCycle();
      return undefined;
    },
  ],
];

it.each(strikes)(
  'an answer struck by %s: an error or a true trace, whichever answer it is',
  async (_, strike) => {
    // The empty line, two of the identity, two of the settings, and four of each of three sweeps.
    const answersOfASession = 17;
    let failures = 0;
    for (let struck = 1; struck <= answersOfASession; struck += 1) {
      const bench = consoleBench();
      const { clock, analyzer, instrument } = bench;
      let answers = 0;
      instrument.faults.onPrint = (text) => {
        answers += 1;
        return answers === struck ? strike(bench, text) : text;
      };
      const insist = async (act: () => Promise<unknown>): Promise<void> => {
        for (let tried = 0; ; tried += 1) {
          try {
            await act();
            return;
          } catch (error) {
            if (!(error instanceof DriverError) || tried === 20) throw error;
            failures += 1;
            await clock.run(clock.sleep(2000));
            await clock.run(analyzer.recover()).catch((again: unknown) => {
              if (!(again instanceof DriverError)) throw again;
            });
          }
        }
      };
      await insist(() => clock.run(analyzer.identify()));
      await insist(() => clock.run(analyzer.prepare(setup)));
      // What is on the mast changes before every sweep: an old table cannot pass for a new one.
      for (const mounted of ['aut', 'reference', 'aut'] as const) {
        bench.scene.mount(mounted);
        await insist(() => expectScene(bench));
      }
      expect(answers).toBeGreaterThanOrEqual(struck);
      await clock.run(analyzer.close());
    }
    expect(failures).toBeGreaterThan(0);
  },
);

const ranges: ConsoleRange[] = [];
afterEach(async () => {
  for (const range of ranges.splice(0)) await range.close();
});

it('is measured with over sockets, by a range file and a plan alone', { timeout: 90_000 }, async () => {
  const range = new ConsoleRange({ seed: 5, noise: { snrDb: 80, reflectionSnrDb: 80 } });
  ranges.push(range);
  const outcome = await range.measure(`
antenna: { name: river-gauge yagi, revision: C }
kind: pattern
band: { from: 840 MHz, to: 890 MHz, points: 11 }
markers: [865 MHz]
analyzer: { ifBandwidth: 1 kHz, power: -7 dBm, averages: 2 }
gainReference: none
cuts:
  - { name: azimuth, axis: azimuth, plane: H, from: -60 deg, to: 60 deg, step: 20 deg }
`);
  expect(outcome.error).toBeUndefined();
  expect(outcome.state).toBe('complete');
  expect(outcome.unconfirmed).toEqual([]);
  const samples = (await range.archive.samples(outcome.run.number)).filter(({ cut }) => cut === 'azimuth');
  expect(samples.map(({ angleDeg }) => Math.round(angleDeg))).toEqual(
    expect.arrayContaining([-60, -40, -20, 0, 20, 40, 60]),
  );
  const at = (azimuthDeg: number, k: number) =>
    range.bench.scene.s('S21', 840e6 + 5e6 * k, range.nowMs(), { azimuthDeg, elevationDeg: 0, rollDeg: 0 });
  for (const { target, traces } of samples) {
    const trace = traces.get('S21') ?? new Float64Array(0);
    expect(trace).toHaveLength(22);
    for (let k = 0; k < 11; k += 1) {
      const wanted = at(target['azimuth']!, k);
      const peak = at(0, k);
      const off = Math.hypot(trace[2 * k]! - wanted.re, trace[2 * k + 1]! - wanted.im);
      // Noise at −80 dB, nine decimals, and a position within 0.05°.
      expect(off / Math.hypot(peak.re, peak.im), `${target['azimuth']}°, point ${k + 1}`).toBeLessThan(3e-3);
    }
  }
});
