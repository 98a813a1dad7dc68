// An instrument that neither echoes nor prompts, and whose scan is begun, awaited and fetched one after the other.
import { describe, expect, it } from 'vitest';
import type { SweepSetup } from '../../../../../drivers/analyzer/analyzer.ts';
import { ScanTableAnalyzer } from '../../../../../drivers/analyzer/scan-table/scan-table-analyzer.ts';
import type { ScanTableDialect } from '../../../../../drivers/analyzer/scan-table/scan-table-dialect.ts';
import { MemoryPort } from '../../../../../drivers/link/memory.ts';
import { SimulatedClock } from '../../../../../mocks/simulated-clock.ts';
import { failureOf } from '../../../../support/analyzer-bench.ts';

const dialect: ScanTableDialect = {
  base: 'scan-table',
  sendsLineEnd: 'lf',
  columns: ['im', 're'],
  source: 'switched',
  fixed: {},
  completion: { by: 'poll', query: 'state', until: 'idle' },
  correctionOnSays: 'corrected',
  templates: {
    identityQuery: ['who'],
    scanS21: ['grid {start} {stop} {points}', 'go {ifBandwidth} {power}', 'table'],
    frequencyQuery: ['axis'],
    output: ['rf {oneZero}'],
    outputQuery: ['rf'],
    correctionQuery: ['data'],
  },
};

const setup: SweepSetup = {
  startHz: 1e9,
  stopHz: 1.2e9,
  points: 3,
  ifBandwidthHz: 500,
  powerDbm: -3,
  averages: 2,
  parameters: ['S21'],
};

function bench(own: Partial<ScanTableDialect> = {}) {
  const clock = new SimulatedClock();
  const heard: string[] = [];
  const spoils = new Map<string, string>();
  let scans = 0;
  let readyMs = 0;
  let rf = '0';
  const port = new MemoryPort(clock, 'memory://bare', { latencyMs: 1 });
  const answer = (line: string): string | undefined => {
    const [word, written] = line.split(' ');
    if (word === 'go') {
      scans += 1;
      readyMs = clock.monotonicMs() + 150;
    }
    if (word === 'rf' && written !== undefined) rf = written;
    const late = clock.monotonicMs() < readyMs;
    const answers: Record<string, string> = {
      who: 'bare bench 12',
      state: late ? 'busy' : 'idle',
      table: [0, 1, 2].map((k) => `${k / 4};\t${scans / 8}`).join('\n'),
      axis: '1.0e9\n1.1e9\n1.2e9',
      data: 'corrected, port 1',
      rf: `rf ${rf}`,
    };
    return written === undefined && word !== 'go' ? (spoils.get(line) ?? answers[line]) : undefined;
  };
  port.listen((visitor) => {
    let typed = '';
    visitor.received$.subscribe((bytes) => {
      typed += Buffer.from(bytes).toString('latin1');
      const lines = typed.split('\n');
      typed = lines.pop() ?? '';
      for (const line of lines.filter((one) => one !== '')) {
        heard.push(line);
        const text = answer(line);
        if (text !== undefined) void visitor.write(Buffer.from(`${text}\n`));
      }
    });
  });
  const analyzer = new ScanTableAnalyzer(port.link(), clock, { dialect: { ...dialect, ...own } });
  return { clock, heard, spoils, analyzer, isRfOn: () => rf === '1' };
}

async function prepared(own: Partial<ScanTableDialect> = {}) {
  const made = bench(own);
  await made.clock.run(made.analyzer.identify());
  await made.clock.run(made.analyzer.prepare(setup));
  made.heard.length = 0;
  return made;
}

describe('an instrument without prompt', () => {
  it('is asked who it is until two answers agree', async () => {
    const { clock, analyzer, heard } = bench();
    expect(await clock.run(analyzer.identify())).toMatchObject({ model: 'bare bench 12' });
    expect(heard).toEqual(['who', 'who']);
  });

  it('is told to begin, waited for, and read, columns in its own order', async () => {
    const { clock, analyzer, heard } = await prepared();
    const { traces, startMonotonicMs, stopMonotonicMs } = await clock.run(analyzer.acquire());
    // Scans 1 and 2 have 1/8 and 2/8 as their real parts.
    expect(Array.from(traces.get('S21')!)).toEqual([0.1875, 0, 0.1875, 0.25, 0.1875, 0.5]);
    expect(stopMonotonicMs - startMonotonicMs).toBeGreaterThanOrEqual(300);
    expect(heard.slice(0, 5)).toEqual([
      'data',
      'grid 1000000000 1200000000 3',
      'go 500 -3',
      'state',
      'state',
    ]);
    expect(heard.filter((line) => line === 'axis')).toHaveLength(2);
  });

  it('is waited for by its estimated time', async () => {
    const { clock, analyzer, heard } = await prepared({ completion: { by: 'wait', factor: 10 } });
    const { startMonotonicMs, stopMonotonicMs } = await clock.run(analyzer.acquire());
    // Three points of 1 ms and two periods of 500 Hz, ten times, twice.
    expect(stopMonotonicMs - startMonotonicMs).toBeGreaterThanOrEqual(300);
    expect(heard).not.toContain('state');
  });

  it.each([
    ['table', '0 1\n0 1', 'ANALYZER_NOT_ANSWERING'],
    ['table', '0 1\n0 1\n0 1 1', 'ANALYZER_BAD_ANSWER'],
    ['table', '0 1\n0 1\nno lock', 'ANALYZER_BAD_ANSWER'],
    ['axis', '1.0e9\n1.1e9\n1.3e9', 'ANALYZER_SETTING_DIFFERS'],
    ['axis', '1.0e9\n1.1e9\noverload', 'ANALYZER_BAD_ANSWER'],
    ['state', 'burning', 'ANALYZER_SWEEP_TIMEOUT'],
    ['data', 'raw', 'ANALYZER_SETTING_DIFFERS'],
  ])('whose %s is %j gives no trace', async (question, text, code) => {
    const { clock, analyzer, spoils } = await prepared();
    spoils.set(question, text);
    expect(await failureOf(clock.run(analyzer.acquire()))).toMatchObject({ code });
    spoils.clear();
    expect((await clock.run(analyzer.acquire())).traces.size).toBe(1);
  });

  it('that says more than it is asked is not believed', async () => {
    const { clock, analyzer, spoils } = await prepared();
    spoils.set('who', 'bare bench 12\nready');
    expect((await failureOf(clock.run(analyzer.recover()))).message).toContain(
      'no two answers in a row agree',
    );
  });

  it('is switched and says so', async () => {
    const { clock, analyzer, spoils, isRfOn } = await prepared();
    await clock.run(analyzer.source(true));
    expect(isRfOn()).toBe(true);
    await clock.run(analyzer.source(false));
    expect(isRfOn()).toBe(false);
    spoils.set('rf', 'rf 1');
    expect(await failureOf(clock.run(analyzer.source(false)))).toMatchObject({
      code: 'ANALYZER_SETTING_DIFFERS',
    });
  });

  it('tells whether its correction is on', async () => {
    const { clock, analyzer, spoils } = await prepared();
    expect(await clock.run(analyzer.calibrationState())).toEqual({ correctionOn: true });
    spoils.set('data', 'raw');
    expect(await clock.run(analyzer.calibrationState())).toEqual({ correctionOn: false });
  });

  it('is closed at any time', async () => {
    const { clock, analyzer } = await prepared();
    const scanning = failureOf(analyzer.acquire());
    await clock.run(clock.sleep(20));
    await clock.run(analyzer.close());
    expect(await clock.run(scanning)).toMatchObject({ code: 'ANALYZER_INTERRUPTED' });
  });
});
