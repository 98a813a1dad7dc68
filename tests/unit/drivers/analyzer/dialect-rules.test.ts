import { describe, expect, it } from 'vitest';
import type { ScpiAnalyzerOptions } from '../../../../drivers/analyzer/scpi-analyzer.ts';
import { dialectNamed } from '../../../../drivers/analyzer/scpi-dialects.ts';
import type { ScpiDialect } from '../../../../drivers/analyzer/scpi-templates.ts';
import {
  type AnalyzerBench,
  analyzerBench,
  failureOf,
  preparedBench,
  sampleSetup,
} from '../../../support/analyzer-bench.ts';

const base = dialectNamed('numbered-parameter');

function benchWith(
  own: Partial<ScpiDialect>,
  analyzer: Partial<ScpiAnalyzerOptions> = {},
): Promise<AnalyzerBench> {
  return preparedBench({ analyzer: { dialect: { ...base, ...own }, ...analyzer } });
}

describe('the end of a sweep', () => {
  const completion = { by: 'poll', query: ':STAT:OPER:COND?', until: '0' } as const;

  it('is polled for by a query of the dialect', async () => {
    const { clock, instrument, analyzer } = await benchWith({ completion });
    let begunMs = 0;
    instrument.twist = (message) => {
      if (message === ':INIT1') begunMs = clock.monotonicMs();
      if (message !== completion.query) return undefined;
      return { ignore: true, reply: clock.monotonicMs() < begunMs + 200 ? '+16' : '+0' };
    };
    const { startMonotonicMs, stopMonotonicMs } = await clock.run(analyzer.acquire());
    expect(stopMonotonicMs - startMonotonicMs).toBeGreaterThanOrEqual(200);
    expect(stopMonotonicMs - startMonotonicMs).toBeLessThan(215);
    expect(instrument.heard).not.toContain('*OPC');
  });

  it('is given up for when the query never says so', async () => {
    const { clock, instrument, analyzer } = await benchWith({ completion });
    instrument.twist = (message) =>
      message === completion.query ? { ignore: true, reply: '16' } : undefined;
    const { message } = await failureOf(clock.run(analyzer.acquire()));
    expect(message).toContain('had not ended');
    await clock.run(clock.sleep(2));
    expect(instrument.heard).toContain(':ABOR');
  });

  it('is waited out, with the stated time and more, and then proven once', async () => {
    const { clock, instrument, analyzer } = await benchWith({ completion: { by: 'wait', factor: 1.5 } });
    const first = await clock.run(analyzer.acquire(['S21']));
    expect(first.stopMonotonicMs - first.startMonotonicMs).toBeGreaterThanOrEqual(300);
    expect(instrument.heard).not.toContain('*OPC');
    const reads = (): number => instrument.heard.filter((one) => one === ':CALC1:DATA? SDATA').length;
    expect(reads()).toBe(2);
    await clock.run(analyzer.acquire(['S21']));
    expect(reads()).toBe(3);
  });

  it('that was waited for too short is found out', async () => {
    const { clock, instrument, analyzer } = await benchWith({ completion: { by: 'wait', factor: 1 } });
    let reads = 0;
    instrument.twist = (message) => {
      if (message !== ':CALC1:DATA? SDATA') return undefined;
      reads += 1;
      return {
        ignore: true,
        reply: instrument.encode(Array.from({ length: 10 }, (_, i) => (i + reads) / 64)),
      };
    };
    const { message } = await failureOf(clock.run(analyzer.acquire(['S21'])));
    expect(message).toContain('went on changing its trace');
  });
});

describe('the columns of a trace', () => {
  const columns = ['frequency', 're', 'im'] as const;
  const axisHz = [800e6, 825e6, 850e6, 875e6, 900e6];
  const rows = (axis: readonly number[]): number[][] => axis.map((hz, i) => [hz, i / 8, -(i + 1) / 16]);

  it.each([
    ['commas', ',', ','],
    ['blanks', ' ', '  '],
    ['semicolons between points', ' ', ' ; '],
    ['tabs', '\t', '\t'],
  ])('may be frequency, real and imaginary part, parted by %s', async (_, within, between) => {
    const { clock, instrument, analyzer } = await benchWith({ columns }, { traceFormat: 'ascii' });
    instrument.twist = (message) => {
      if (!message.includes('DATA?')) return undefined;
      return {
        ignore: true,
        reply: rows(axisHz)
          .map((row) => row.join(within))
          .join(between),
      };
    };
    const { traces } = await clock.run(analyzer.acquire(['S21']));
    expect(Array.from(traces.get('S21')!)).toEqual(rows(axisHz).flatMap(([, re, im]) => [re, im]));
  });

  it('prove the grid', async () => {
    const { clock, instrument, analyzer } = await benchWith({ columns });
    const moved = axisHz.map((hz) => hz + 1e6);
    instrument.twist = (message) =>
      message.includes('DATA?') ? { ignore: true, reply: instrument.encode(rows(moved).flat()) } : undefined;
    expect(await failureOf(clock.run(analyzer.acquire(['S21'])))).toMatchObject({
      code: 'ANALYZER_SETTING_DIFFERS',
      facts: { asked: 800e6, got: 801e6 },
    });
  });
});

it.each([
  ['"NC1,S11,NC2,S21"', true],
  ['"NC2,S21,NC1,S11"', true],
  ['"NC1,S11,NC2,S12"', false],
  ['"NC1,S11"', false],
  ['"NC1,S11,NC2,S21,MINE,S21"', false],
  ['"NO CATALOG"', false],
])('is content with the list of measurements %s: %s', async (list, isContent) => {
  const templates = { ...base.templates, parameterListQuery: ':CALC{channel}:PAR:CAT?' };
  const { clock, instrument, analyzer } = analyzerBench({ analyzer: { dialect: { ...base, templates } } });
  instrument.twist = (message) => (message === ':CALC1:PAR:CAT?' ? { ignore: true, reply: list } : undefined);
  await clock.run(analyzer.identify());
  const work = clock.run(analyzer.prepare(sampleSetup));
  if (isContent) await work;
  else expect(await failureOf(work)).toMatchObject({ code: 'ANALYZER_SETTING_DIFFERS' });
});

it('has an output that is switched by 1 and 0', async () => {
  const { clock, instrument, analyzer } = await benchWith({
    templates: { ...base.templates, output: ':OUTP {oneZero}' },
  });
  await clock.run(analyzer.source(false));
  expect(instrument.settings.output).toBe(false);
  await clock.run(analyzer.source(true));
  expect(instrument.settings.output).toBe(true);
  expect(instrument.heard).toEqual(expect.arrayContaining([':OUTP 0', ':OUTP 1']));
});
