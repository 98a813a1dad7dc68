import { describe, expect, it } from 'vitest';
import type { SParameter } from '../../../../drivers/analyzer/analyzer.ts';
import { dialectNamed } from '../../../../drivers/analyzer/scpi-dialects.ts';
import { failureOf, preparedBench, sampleSetup } from '../../../support/analyzer-bench.ts';
import { blockOf, type ScriptedInstrument } from '../../../support/scripted-instrument.ts';

function expectedTrace(instrument: ScriptedInstrument, parameter: SParameter): number[] {
  return Array.from({ length: 5 }, (_, point) => instrument.value(parameter, point)).flat();
}

function count(instrument: ScriptedInstrument, message: string): number {
  return instrument.heard.filter((one) => one === message).length;
}

describe('traces', () => {
  it.each([
    ['real64', 'normal', 15],
    ['real64', 'swapped', 15],
    ['real32', 'normal', 7],
    ['real32', 'swapped', 7],
    ['ascii', 'normal', 11],
  ] as const)('come over as %s, %s', async (traceFormat, byteOrder, digits) => {
    const { clock, instrument, analyzer } = await preparedBench({
      analyzer: { traceFormat, byteOrder },
      instrument: { blank: ' ' },
    });
    const { traces } = await clock.run(analyzer.acquire());
    expect([...traces.keys()]).toEqual(['S11', 'S21']);
    for (const [parameter, trace] of traces) {
      const expected = expectedTrace(instrument, parameter);
      expect(trace).toHaveLength(10);
      for (const [i, value] of expected.entries()) expect(trace[i]).toBeCloseTo(value, digits);
    }
  });

  it('of a subset are read alone, each selected first', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    const { traces } = await clock.run(analyzer.acquire(['S21']));
    expect([...traces.keys()]).toEqual(['S21']);
    expect(Array.from(traces.get('S21')!)).toEqual(expectedTrace(instrument, 'S21'));
    expect(count(instrument, ':CALC1:DATA? SDATA')).toBe(1);
    expect(instrument.heard[instrument.heard.indexOf(':CALC1:DATA? SDATA') - 1]).toBe(':CALC1:PAR2:SEL');
  });

  it('that were not prepared are a defect of the caller', async () => {
    const { clock, analyzer } = await preparedBench();
    expect((await failureOf(clock.run(analyzer.acquire(['S12'])))).message).toContain('defect');
  });

  it('arrive whole in packets of any size', async () => {
    let turn = 0;
    const cut = (bytes: Uint8Array): Uint8Array[] => {
      const pieces: Uint8Array[] = [];
      for (let at = 0; at < bytes.length; ) {
        const size = 1 + ((turn++ * 7) % 13);
        pieces.push(bytes.subarray(at, at + size));
        at += size;
      }
      return pieces;
    };
    const { clock, instrument, analyzer } = await preparedBench({ wire: { latencyMs: 1, cut } });
    const { traces } = await clock.run(analyzer.acquire());
    expect(Array.from(traces.get('S11')!)).toEqual(expectedTrace(instrument, 'S11'));
  });
});

describe('the sweep', () => {
  it('ends when the instrument says so, soon after, with a time law within it', async () => {
    const { clock, instrument, analyzer } = await preparedBench({ instrument: { sweepMs: 1000 } });
    const { startMonotonicMs, stopMonotonicMs, timeLaw } = await clock.run(analyzer.acquire());
    expect(stopMonotonicMs - startMonotonicMs).toBeGreaterThanOrEqual(1000);
    expect(stopMonotonicMs - startMonotonicMs).toBeLessThan(1010);
    // Five points in 1000 ms, each measured in the middle of its 200 ms.
    expect(timeLaw.firstMs).toBeCloseTo(100, 6);
    expect(timeLaw.lastMs).toBeCloseTo(900, 6);
    expect(count(instrument, '*OPC?')).toBe(0);
  });

  it('is waited for by an instrument that answers nothing while it sweeps', async () => {
    const { clock, instrument, analyzer } = await preparedBench({ instrument: { sweepMs: 8000 } });
    let deafUntilMs = 0;
    instrument.twist = (message) => {
      const nowMs = clock.monotonicMs();
      if (message === ':INIT1') deafUntilMs = nowMs + 8000;
      if (message !== '*ESR?' || nowMs >= deafUntilMs) return undefined;
      return { reply: '1', delayMs: deafUntilMs - nowMs };
    };
    const { startMonotonicMs, stopMonotonicMs } = await clock.run(analyzer.acquire());
    expect(stopMonotonicMs - startMonotonicMs).toBeGreaterThanOrEqual(8000);
    expect(instrument.visits).toBe(1);
  });

  it('may take longer than stated, by half and half a second, and not much more', async () => {
    const { clock, instrument, analyzer } = await preparedBench({ instrument: { sweepMs: 1000 } });
    instrument.sweepMs = 1900;
    await clock.run(analyzer.acquire());
    instrument.sweepMs = 2500;
    const error = await failureOf(clock.run(analyzer.acquire()));
    expect(error).toMatchObject({
      code: 'ANALYZER_SWEEP_TIMEOUT',
      facts: { allowedMs: 2000, statedMs: 1000 },
    });
  });

  it('that hangs is aborted, and the next one works', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    instrument.hanging = true;
    expect(await failureOf(clock.run(analyzer.acquire()))).toMatchObject({ code: 'ANALYZER_SWEEP_TIMEOUT' });
    await clock.run(clock.sleep(2));
    expect(instrument.heard.at(-1)).toBe(':ABOR');
    expect(analyzer.inStep).toBe(true);
    expect(clock.monotonicMs()).toBeLessThan(2000);
    await clock.run(analyzer.acquire());
  });

  it('is started once for each sweep of an average, the average cleared before', async () => {
    const { clock, instrument, analyzer } = await preparedBench({ setup: { averages: 3 } });
    const { startMonotonicMs, stopMonotonicMs, timeLaw } = await clock.run(analyzer.acquire());
    expect(instrument.sweeps).toBe(3);
    expect(instrument.clears).toBe(1);
    expect(instrument.heard.indexOf(':SENS1:AVER:CLE')).toBeLessThan(instrument.heard.indexOf(':INIT1'));
    expect(stopMonotonicMs - startMonotonicMs).toBeGreaterThanOrEqual(600);
    // The middle of the average lies in the middle of all its sweeps.
    const middleMs = (timeLaw.firstMs + timeLaw.lastMs) / 2;
    expect(Math.abs(middleMs - (stopMonotonicMs - startMonotonicMs) / 2)).toBeLessThan(5);
  });

  it('is started once where the instrument averages each point', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    instrument.averagesByPoint = true;
    const sweep = await clock.run(analyzer.prepare({ ...sampleSetup, averages: 4 }));
    expect(sweep.acquisitionMs).toBe(800);
    const { startMonotonicMs, stopMonotonicMs, timeLaw } = await clock.run(analyzer.acquire());
    expect(instrument.sweeps).toBe(1);
    expect(stopMonotonicMs - startMonotonicMs).toBeGreaterThanOrEqual(800);
    expect(stopMonotonicMs - startMonotonicMs).toBeLessThan(810);
    // Five points in 800 ms.
    expect(timeLaw.firstMs).toBeCloseTo(80, 6);
    expect(timeLaw.lastMs).toBeCloseTo(720, 6);
  });

  it('is started once where one start runs the whole average', async () => {
    const dialect = { ...dialectNamed('numbered-parameter'), oneStartRuns: 'whole-average' as const };
    const { clock, instrument, analyzer } = await preparedBench({
      setup: { averages: 3 },
      analyzer: { dialect },
    });
    instrument.sweepMs = 600;
    const { startMonotonicMs, stopMonotonicMs, timeLaw } = await clock.run(analyzer.acquire());
    expect(instrument.sweeps).toBe(1);
    expect(stopMonotonicMs - startMonotonicMs).toBeGreaterThanOrEqual(600);
    expect((timeLaw.firstMs + timeLaw.lastMs) / 2).toBeCloseTo(300, 0);
  });

  it('is aborted when the caller gives up', async () => {
    const { clock, instrument, analyzer } = await preparedBench({ instrument: { sweepMs: 5000 } });
    const giveUp = new AbortController();
    const sweeping = failureOf(analyzer.acquire(['S21'], giveUp.signal));
    await clock.run(clock.sleep(1000));
    const begunMs = clock.monotonicMs();
    giveUp.abort(new Error('enough'));
    expect(await clock.run(sweeping)).toMatchObject({ message: 'enough' });
    expect(clock.monotonicMs() - begunMs).toBeLessThan(2);
    await clock.run(clock.sleep(2));
    expect(instrument.heard.at(-1)).toBe(':ABOR');
    await clock.run(analyzer.acquire());
    expect(await failureOf(clock.run(analyzer.acquire(['S21'], giveUp.signal)))).toMatchObject({
      message: 'enough',
    });
  });

  it('leaves no listener on a signal that lives for a night', async () => {
    const { clock, analyzer } = await preparedBench();
    const night = new AbortController();
    let listening = 0;
    const { signal } = night;
    const add = signal.addEventListener.bind(signal);
    const remove = signal.removeEventListener.bind(signal);
    signal.addEventListener = (...args: Parameters<typeof add>) => {
      listening += 1;
      add(...args);
    };
    signal.removeEventListener = (...args: Parameters<typeof remove>) => {
      listening -= 1;
      remove(...args);
    };
    await clock.run(analyzer.acquire(undefined, signal));
    expect(listening).toBeLessThanOrEqual(0);
  });
});

describe('errors of the instrument', () => {
  it('during a sweep are thrown with its words', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    instrument.twist = (message) => {
      if (message === ':INIT1') instrument.error('103,"Source unlevelled"', 8);
      return undefined;
    };
    expect(await failureOf(clock.run(analyzer.acquire()))).toMatchObject({
      code: 'ANALYZER_DEVICE_ERROR',
      facts: { scpiCode: 103, scpiText: 'Source unlevelled' },
    });
    instrument.twist = () => undefined;
    await clock.run(analyzer.acquire());
  });

  it('that only the register knows are thrown too', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    instrument.twist = (message) => {
      if (message === ':INIT1') instrument.events |= 8;
      return undefined;
    };
    expect(await failureOf(clock.run(analyzer.acquire()))).toMatchObject({ code: 'ANALYZER_DEVICE_ERROR' });
  });

  it('do not pass with a select that was refused', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    instrument.twist = (message) => {
      if (message !== ':CALC1:PAR2:SEL') return undefined;
      instrument.error('-292,"Referenced name does not exist"');
      return { reply: null, ignore: true };
    };
    expect(await failureOf(clock.run(analyzer.acquire(['S21'])))).toMatchObject({
      code: 'ANALYZER_COMMAND_REFUSED',
    });
  });

  it('repairs a refused start (continuous sweep was switched on) and sweeps', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    instrument.settings.continuous = true;
    await clock.run(analyzer.acquire());
    expect(instrument.settings.continuous).toBe(false);
    expect(instrument.sweeps).toBe(1);
  });

  it('gives up a start that is refused twice', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    instrument.twist = (message) => {
      if (message !== ':INIT1') return undefined;
      instrument.error('-213,"Init ignored"');
      return { reply: null, ignore: true };
    };
    expect(await failureOf(clock.run(analyzer.acquire()))).toMatchObject({
      code: 'ANALYZER_DEVICE_ERROR',
      facts: { scpiCode: -213 },
    });
    expect(count(instrument, ':INIT1')).toBe(2);
  });

  it('sweeps again when the trace is called stale', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    let refusals = 1;
    instrument.twist = (message) => {
      if (message !== ':CALC1:DATA? SDATA' || refusals-- <= 0) return undefined;
      instrument.error('-230,"Data corrupt or stale"');
      return { reply: null };
    };
    const { traces } = await clock.run(analyzer.acquire(['S21']));
    expect(instrument.sweeps).toBe(2);
    expect(Array.from(traces.get('S21')!)).toEqual(expectedTrace(instrument, 'S21'));
  });

  it('tell of a power cycle behind an unbroken link', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    instrument.settings.points = 201;
    instrument.events = 128;
    expect(await failureOf(clock.run(analyzer.acquire()))).toMatchObject({ code: 'ANALYZER_POWER_CYCLED' });
    await clock.run(analyzer.acquire());
    expect(instrument.settings.points).toBe(5);
  });

  it('show a power cycle between two sweeps', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    await clock.run(analyzer.acquire());
    instrument.powerCycle();
    await clock.run(clock.sleep(5));
    expect(await failureOf(clock.run(analyzer.acquire()))).toMatchObject({ code: 'ANALYZER_POWER_CYCLED' });
    expect(instrument.sweeps).toBe(1);
    await clock.run(analyzer.acquire());
    expect(instrument.settings.points).toBe(5);
  });
});

describe('data that cannot be', () => {
  const data = ':CALC1:DATA? SDATA';

  async function acquireWith(reply: string | Uint8Array, traceFormat: 'real64' | 'ascii' = 'real64') {
    const bench = await preparedBench({ analyzer: { traceFormat } });
    bench.instrument.twist = (message) => (message === data ? { reply } : undefined);
    const error = await failureOf(bench.clock.run(bench.analyzer.acquire(['S21'])));
    expect(bench.analyzer.inStep).toBe(true);
    bench.instrument.twist = () => undefined;
    await bench.clock.run(bench.analyzer.acquire(['S21']));
    return error;
  }

  function doubles(...values: number[]): Uint8Array {
    const body = Buffer.alloc(values.length * 8);
    for (const [i, value] of values.entries()) body.writeDoubleBE(value, i * 8);
    return blockOf(body);
  }

  const nine = [1, 2, 3, 4, 5, 6, 7, 8, 9].map((n) => n / 100);

  it.each([
    ['nan', 'ascii', `${nine.join(', ')}, nan`],
    ['overflow', 'ascii', `${nine.join(',')},9.9E37`],
    ['a binary NaN', 'real64', doubles(...nine, Number.NaN)],
    ['infinity', 'real64', doubles(...nine, Infinity)],
    ['40 dB of gain', 'real64', doubles(...nine, 100)],
    ['nothing but zeros', 'real64', doubles(...nine.map(() => 0), -0)],
    // What a little-endian 0.0244 looks like in big-endian order: finite, and nonsense.
    ['bytes in the wrong order', 'real64', doubles(...nine.map(() => -2.18e-107), -7.84e-111)],
  ] as const)('refuses %s', async (_, format, reply) => {
    expect(await acquireWith(reply, format)).toMatchObject({
      code: 'ANALYZER_IMPLAUSIBLE_DATA',
      facts: { parameter: 'S21' },
    });
  });

  it.each([
    ['a number too few', doubles(...nine), 'numbers instead of'],
    ['a number too many', doubles(...nine, 1, 2), 'numbers instead of'],
    ['half a number', blockOf(new Uint8Array(9 * 8 + 4)), 'whole number'],
    ['a length that would fill the memory', '#9999999999', 'at most'],
    ['a block without length', '#0abcdef', 'another trace format'],
    ['a line instead of a block', '+1.0E-2,+2.0E-2', 'something else'],
  ])('refuses %s', async (_, reply, words) => {
    const error = await acquireWith(reply);
    expect(error).toMatchObject({ code: 'ANALYZER_BAD_BLOCK' });
    expect(error.message).toContain(words);
  });

  it('shows the first bytes of what it refused', async () => {
    expect(await acquireWith('#0abcdef')).toMatchObject({
      facts: { message: data, firstBytesHex: '23 30 61 62 63 64 65 66 0d 0a' },
    });
  });

  it.each([
    ['a number too few', nine.join(','), 'ANALYZER_BAD_ANSWER'],
    ['words', 'sorry, busy', 'ANALYZER_BAD_ANSWER'],
    ['a block', doubles(...nine, 1), 'ANALYZER_BAD_ANSWER'],
  ])('refuses %s among decimals', async (_, reply, code) => {
    expect(await acquireWith(reply, 'ascii')).toMatchObject({ code });
  });

  it('refuses a frozen trace as long as it is frozen', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    await clock.run(analyzer.acquire());
    instrument.frozen = true;
    for (let i = 0; i < 2; i += 1) {
      expect(await failureOf(clock.run(analyzer.acquire()))).toMatchObject({
        code: 'ANALYZER_IMPLAUSIBLE_DATA',
        facts: { frozen: true },
      });
    }
    instrument.frozen = false;
    await clock.run(analyzer.acquire());
  });

  it('never returns half of a trace when the link drops in it', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    instrument.twist = (message) =>
      message === data ? { reply: doubles(...nine, 1).subarray(0, 50), thenDrop: true } : undefined;
    expect(await failureOf(clock.run(analyzer.acquire()))).toMatchObject({ code: 'LINK_CLOSED' });
    instrument.twist = () => undefined;
    await clock.run(analyzer.acquire());
  });

  it('never takes an answer that came too late for a trace', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    let late = true;
    instrument.twist = (message) => {
      if (message !== data || !late) return undefined;
      late = false;
      return { delayMs: 4000 };
    };
    expect(await failureOf(clock.run(analyzer.acquire(['S11'])))).toMatchObject({
      code: 'ANALYZER_NOT_ANSWERING',
    });
    const { traces } = await clock.run(analyzer.acquire(['S21']));
    expect(Array.from(traces.get('S21')!)).toEqual(expectedTrace(instrument, 'S21'));
    await clock.run(clock.sleep(5000));
    await clock.run(analyzer.acquire(['S11']));
  });
});

describe('hands at the front panel', () => {
  it.each(['real64', 'ascii'] as const)(
    'a moved stop frequency is put right and swept again (%s)',
    async (traceFormat) => {
      const { clock, instrument, analyzer } = await preparedBench({ analyzer: { traceFormat } });
      instrument.settings.stopHz = 950e6;
      await clock.run(analyzer.acquire());
      expect(instrument.settings.stopHz).toBe(900e6);
      expect(instrument.sweeps).toBe(2);
    },
  );

  it('that do not rest are reported', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    instrument.twist = (message) => {
      if (message === ':INIT1') instrument.settings.startHz = 810e6;
      return undefined;
    };
    expect(await failureOf(clock.run(analyzer.acquire()))).toMatchObject({
      code: 'ANALYZER_SETTING_DIFFERS',
      facts: { afterSweep: true, setting: expect.stringContaining('frequency of point 1') },
    });
    expect(instrument.sweeps).toBe(2);
  });

  it('changed points cost one acquisition, not the night', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    instrument.settings.points = 7;
    expect(await failureOf(clock.run(analyzer.acquire()))).toMatchObject({ code: 'ANALYZER_BAD_BLOCK' });
    await clock.run(analyzer.acquire());
  });

  it('a changed byte order is noticed', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    instrument.settings.border = 'SWAP';
    await clock.run(analyzer.acquire());
    expect(instrument.settings.border).toBe('NORM');
  });

  it('bytes that nobody asked for cost a reconnection, and no sample', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    instrument.say('+0,"No error"\r\n');
    await clock.run(clock.sleep(5));
    expect(analyzer.inStep).toBe(false);
    const { traces } = await clock.run(analyzer.acquire(['S21']));
    expect(Array.from(traces.get('S21')!)).toEqual(expectedTrace(instrument, 'S21'));
    expect(instrument.visits).toBe(2);
  });
});
