import { describe, expect, it } from 'vitest';
import { dialectNamed } from '../../../../drivers/analyzer/scpi-dialects.ts';
import { analyzerBench, failureOf, preparedBench, sampleSetup } from '../../../support/analyzer-bench.ts';

const differs = { code: 'ANALYZER_SETTING_DIFFERS' };

describe('identify', () => {
  it('says who is there and asks anew when in step', async () => {
    const { clock, instrument, analyzer } = analyzerBench();
    expect(analyzer.inStep).toBe(false);
    const identity = await clock.run(analyzer.identify());
    expect(identity).toEqual({ maker: 'TESTWERK', model: 'VN-2', serial: '77', firmware: '1.0' });
    expect(await clock.run(analyzer.identify())).toEqual(identity);
    expect(instrument.visits).toBe(1);
  });

  it('notices another instrument, and speaks to it no further', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    instrument.identity = 'TESTWERK,VN-2,78,1.0';
    await instrument.visitor?.close();
    const attempts: (() => Promise<unknown>)[] = [
      () => analyzer.recover(),
      () => analyzer.acquire(),
      () => analyzer.identify(),
    ];
    for (const work of attempts) {
      await clock.run(clock.sleep(5));
      expect(await failureOf(clock.run(work()))).toMatchObject({
        code: 'ANALYZER_IDENTITY_CHANGED',
        facts: { field: 'serial', before: '77', now: '78' },
      });
    }
    expect(instrument.heard.filter((message) => message.startsWith(':INIT'))).toEqual([]);
  });

  it('accepts new firmware', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    instrument.identity = 'TESTWERK,VN-2,77,1.1';
    await clock.run(analyzer.recover());
  });

  it('reports an instrument that serves somebody else, once and not for long', async () => {
    const { clock, instrument, analyzer } = analyzerBench();
    instrument.twist = () => ({ reply: null });
    expect(await failureOf(clock.run(analyzer.identify()))).toMatchObject({ code: 'ANALYZER_NOT_ANSWERING' });
    expect(instrument.visits).toBe(1);
    expect(clock.monotonicMs()).toBeLessThan(4000);
  });
});

describe('prepare', () => {
  it('sets everything and returns what the instrument has', async () => {
    const { clock, instrument, analyzer } = analyzerBench();
    await clock.run(analyzer.identify());
    const sweep = await clock.run(analyzer.prepare({ ...sampleSetup, averages: 4 }));
    expect(instrument.settings).toMatchObject({
      startHz: 800e6,
      stopHz: 900e6,
      points: 5,
      band: 1000,
      power: -10,
      averages: 4,
      averaging: true,
      continuous: false,
      format: 'REAL,64',
      border: 'NORM',
    });
    expect(instrument.parameters).toEqual(['S11', 'S21']);
    expect(sweep).toMatchObject({ ifBandwidthHz: 1000, powerDbm: -10, averages: 4, acquisitionMs: 800 });
    expect(Array.from(sweep.frequenciesHz)).toEqual([800e6, 825e6, 850e6, 875e6, 900e6]);
  });

  it('never lets start pass stop, in either direction', async () => {
    const { clock, instrument, analyzer } = analyzerBench();
    let crossed = 0;
    instrument.twist = () => {
      if (instrument.settings.startHz > instrument.settings.stopHz) crossed += 1;
      return undefined;
    };
    await clock.run(analyzer.identify());
    for (const startHz of [800e6, 2400e6, 100e6]) {
      await clock.run(analyzer.prepare({ ...sampleSetup, startHz, stopHz: startHz + 50e6 }));
    }
    expect(instrument.settings).toMatchObject({ startHz: 100e6, stopHz: 150e6 });
    expect(crossed).toBe(0);
  });

  it.each([['IF bandwidth', { ifBandwidthHz: 1234 }, { asked: 1234, got: 1500 }]])(
    'refuses a coerced %s',
    async (setting, change, facts) => {
      const { clock, analyzer } = analyzerBench();
      await clock.run(analyzer.identify());
      const error = await failureOf(clock.run(analyzer.prepare({ ...sampleSetup, ...change })));
      expect(error).toMatchObject({
        ...differs,
        facts: { setting: expect.stringContaining(setting), ...facts },
      });
      expect(analyzer.inStep).toBe(true);
    },
  );

  it.each([
    [':SENS1:SWE:POIN', 'points', '6'],
    [':SENS1:FREQ:STAR', 'start', '800010000'],
    [':SENS1:FREQ:STOP', 'stop', '899990000'],
    [':SOUR1:POW', 'power', '-10.5'],
    [':INIT1:CONT', 'continuous', '1'],
    [':FORM', 'format', 'REAL,32'],
    [':FORM:BORD', 'byte order', 'SWAP'],
    [':CALC1:PAR2:DEF', 'S-parameter', 'S12'],
    [':CALC1:PAR:COUN', 'number', '1'],
    [':SENS1:AVER', 'averag', '1'],
  ])('refuses another value read back with %s', async (header, setting, reply) => {
    const { clock, instrument, analyzer } = analyzerBench();
    await clock.run(analyzer.identify());
    instrument.twist = (message) => (message === `${header}?` ? { reply } : undefined);
    const error = await failureOf(clock.run(analyzer.prepare(sampleSetup)));
    expect(error).toMatchObject({ ...differs, facts: { setting: expect.stringContaining(setting) } });
  });

  it('accepts read-back in any form of number', async () => {
    const { clock, instrument, analyzer } = analyzerBench();
    await clock.run(analyzer.identify());
    instrument.twist = (message) => {
      if (message === ':SENS1:FREQ:STAR?') return { reply: '+8.0000000E+08' };
      if (message === ':SENS1:SWE:POIN?') return { reply: '+5' };
      if (message === ':FORM?') return { reply: 'real, +64' };
      return message === ':INIT1:CONT?' ? { reply: 'OFF' } : undefined;
    };
    await clock.run(analyzer.prepare(sampleSetup));
  });

  it('reports what the instrument refuses, with its words', async () => {
    const { clock, instrument, analyzer } = analyzerBench();
    await clock.run(analyzer.identify());
    const error = await failureOf(clock.run(analyzer.prepare({ ...sampleSetup, powerDbm: 99 })));
    expect(error).toMatchObject({
      code: 'ANALYZER_COMMAND_REFUSED',
      facts: { scpiCode: -222, scpiText: 'Data out of range', entriesLost: false },
    });
    expect(instrument.errors).toEqual([]);
  });

  it('says when the error queue had overflowed', async () => {
    const { clock, instrument, analyzer } = analyzerBench();
    await clock.run(analyzer.identify());
    instrument.twist = (message) => {
      if (message === ':SENS1:BAND 1000')
        for (let i = 0; i < 20; i += 1) instrument.error(`-113,"Undefined header;X${i}"`);
      return undefined;
    };
    expect(await failureOf(clock.run(analyzer.prepare(sampleSetup)))).toMatchObject({
      code: 'ANALYZER_COMMAND_REFUSED',
      facts: { scpiCode: -113, entries: 16, entriesLost: true },
    });
  });

  it('does not lay old errors to the new settings', async () => {
    const { clock, instrument, analyzer } = analyzerBench();
    await clock.run(analyzer.identify());
    await clock.run(clock.sleep(5));
    instrument.error('-224,"Illegal parameter value"');
    await clock.run(analyzer.prepare(sampleSetup));
    await clock.run(analyzer.acquire());
  });

  it('tells the reason of a query that was refused, and is in step again', async () => {
    const { clock, instrument, analyzer } = analyzerBench();
    await clock.run(analyzer.identify());
    instrument.twist = (message) => {
      if (message !== ':SENS1:BAND?') return undefined;
      instrument.error('-113,"Undefined header;SENS1:BAND?"', 32);
      return { reply: null };
    };
    const error = await failureOf(clock.run(analyzer.prepare(sampleSetup)));
    expect(error).toMatchObject({ code: 'ANALYZER_COMMAND_REFUSED', facts: { scpiCode: -113 } });
    expect(error.message).toContain('SENS1:BAND?');
    expect(error.cause).toMatchObject({ code: 'ANALYZER_NOT_ANSWERING' });
    expect(analyzer.inStep).toBe(true);
    expect(instrument.visits).toBe(2);
  });

  it('asks no second time for what the instrument does not have and need not have', async () => {
    const { clock, instrument, analyzer } = analyzerBench();
    await clock.run(analyzer.identify());
    const missing = [':SENS1:SWE:TIME?', ':CALC1:X?'];
    instrument.twist = (message) => {
      if (!missing.includes(message)) return undefined;
      instrument.error(`-113,"Undefined header;${message}"`, 32);
      return { reply: null };
    };
    const sweep = await clock.run(analyzer.prepare(sampleSetup));
    // Five points of 1 ms and two settling times of a 1 kHz filter each: common practice, no source.
    expect(sweep.acquisitionMs).toBeCloseTo(5 * (1 + 2), 6);
    for (let count = 0; count < 3; count += 1) await clock.run(analyzer.acquire());
    await clock.run(analyzer.recover());
    for (const query of missing) expect(instrument.heard.filter((one) => one === query)).toHaveLength(1);
    // Without an axis the grid is confirmed by its edges and its number of points.
    instrument.heard.length = 0;
    await clock.run(analyzer.acquire());
    expect(instrument.heard.slice(-3)).toEqual([
      ':SENS1:SWE:POIN?',
      ':SENS1:FREQ:STAR?',
      ':SENS1:FREQ:STOP?',
    ]);
  });

  it('says that a question stayed unanswered when the queue knows no reason', async () => {
    const { clock, instrument, analyzer } = analyzerBench();
    await clock.run(analyzer.identify());
    instrument.twist = (message) => (message === ':SOUR1:POW?' ? { reply: null } : undefined);
    expect(await failureOf(clock.run(analyzer.prepare(sampleSetup)))).toMatchObject({
      code: 'ANALYZER_NOT_ANSWERING',
      facts: { message: ':SOUR1:POW?' },
    });
    expect(analyzer.inStep).toBe(true);
  });

  it('says that it is out of step when the instrument stays silent', async () => {
    const { clock, instrument, analyzer } = analyzerBench();
    await clock.run(analyzer.identify());
    instrument.twist = () => ({ reply: null });
    const error = await failureOf(clock.run(analyzer.prepare(sampleSetup)));
    expect(error).toMatchObject({ code: 'ANALYZER_NOT_ANSWERING', facts: { inStep: false } });
    expect(analyzer.inStep).toBe(false);
  });

  it('reports an unreadable answer with its bytes', async () => {
    const { clock, instrument, analyzer } = analyzerBench();
    await clock.run(analyzer.identify());
    instrument.twist = (message) => (message === ':SENS1:SWE:POIN?' ? { reply: '\x80zzz' } : undefined);
    expect(await failureOf(clock.run(analyzer.prepare(sampleSetup)))).toMatchObject({
      code: 'ANALYZER_BAD_ANSWER',
      facts: { message: ':SENS1:SWE:POIN?', firstBytesHex: '80 7a 7a 7a' },
    });
    expect(instrument.visits).toBe(2);
  });

  it('lives without what a dialect does not have', async () => {
    const dialect = dialectNamed('numbered-parameter');
    const {
      frequencyAxisQuery: _axis,
      sweepTimeQuery: _time,
      correctionQuery: _correction,
      parameterDefineQuery: _define,
      byteOrderQuery: _order,
      ...templates
    } = dialect.templates;
    const { clock, instrument, analyzer } = await preparedBench({
      analyzer: { dialect: { ...dialect, templates } },
    });
    await clock.run(analyzer.acquire());
    expect(await clock.run(analyzer.calibrationState())).toEqual({ correctionOn: false });
    expect(instrument.heard.filter((message) => /X\?|TIME|CORR|BORD\?/.test(message))).toEqual([]);
  });

  it('refuses a dialect it cannot use, before anything is sent', () => {
    const dialect = dialectNamed('numbered-parameter');
    const templates = { ...dialect.templates, power: ':SOUR:POW {value};:OUTP ON' };
    expect(() => analyzerBench({ analyzer: { dialect: { ...dialect, templates } } })).toThrow(
      expect.objectContaining({ code: 'ANALYZER_BAD_DIALECT' }),
    );
  });
});

describe('calibration', () => {
  it('is what the instrument says', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    expect(await clock.run(analyzer.calibrationState())).toEqual({ correctionOn: true });
    instrument.settings.correction = false;
    expect(await clock.run(analyzer.calibrationState())).toEqual({ correctionOn: false });
  });
});

describe('recover', () => {
  it('opens anew and sends the whole setup again', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    instrument.settings.points = 3;
    await clock.run(analyzer.recover());
    expect(instrument.visits).toBe(2);
    expect(instrument.settings.points).toBe(5);
  });

  it('after a power cycle: prepared again, told once, and never resumed in silence', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    instrument.powerCycle();
    await clock.run(clock.sleep(5));
    expect(await failureOf(clock.run(analyzer.recover()))).toMatchObject({ code: 'ANALYZER_POWER_CYCLED' });
    expect(instrument.settings).toMatchObject({ points: 5, continuous: false, format: 'REAL,64' });
    await clock.run(analyzer.recover());
    await clock.run(analyzer.acquire());
  });

  it('refuses to go on when a power cycle has lost the correction', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    instrument.powerCycle();
    instrument.settings.correction = false;
    await clock.run(clock.sleep(5));
    for (let i = 0; i < 2; i += 1) {
      expect(await failureOf(clock.run(analyzer.recover()))).toMatchObject({
        ...differs,
        facts: { setting: 'correction', asked: true, got: false },
      });
    }
    instrument.settings.correction = true;
    expect(await failureOf(clock.run(analyzer.recover()))).toMatchObject({ code: 'ANALYZER_POWER_CYCLED' });
  });

  it('can be asked again and again while the instrument boots', async () => {
    const { clock, instrument, analyzer, port, listener } = await preparedBench();
    instrument.powerCycle();
    await listener.close();
    await clock.run(clock.sleep(5));
    expect(await failureOf(clock.run(analyzer.recover()))).toMatchObject({ code: 'LINK_OPEN_FAILED' });
    port.listen(instrument.accept);
    instrument.twist = () => ({ reply: null });
    expect(await failureOf(clock.run(analyzer.recover()))).toMatchObject({ code: 'ANALYZER_NOT_ANSWERING' });
    instrument.twist = () => undefined;
    expect(await failureOf(clock.run(analyzer.recover()))).toMatchObject({ code: 'ANALYZER_POWER_CYCLED' });
    await clock.run(analyzer.acquire());
  });
});

describe('source', () => {
  it('goes on and off, confirmed', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    await clock.run(analyzer.source(false));
    expect(instrument.settings.output).toBe(false);
    await clock.run(analyzer.source(true));
    expect(instrument.settings.output).toBe(true);
    expect(instrument.visits).toBe(1);
  });

  it('says when the instrument does not follow', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    instrument.twist = (message) => (message === ':OUTP?' ? { reply: '1' } : undefined);
    expect(await failureOf(clock.run(analyzer.source(false)))).toMatchObject({
      ...differs,
      facts: { got: true },
    });
  });

  it('goes off in the middle of a sweep, at once, without reconnecting', async () => {
    const { clock, instrument, analyzer } = await preparedBench({ instrument: { sweepMs: 5000 } });
    const sweeping = failureOf(analyzer.acquire());
    await clock.run(clock.sleep(1000));
    const begunMs = clock.monotonicMs();
    const off = analyzer.source(false);
    await clock.run(clock.sleep(2));
    expect(instrument.settings.output).toBe(false);
    await clock.run(off);
    expect(clock.monotonicMs() - begunMs).toBeLessThan(200);
    expect(await clock.run(sweeping)).toMatchObject({ code: 'ANALYZER_INTERRUPTED' });
    expect(instrument.heard).toContain(':ABOR');
    expect(instrument.visits).toBe(1);
  });

  it('goes off while a question hangs: the command leaves at once, the session is opened anew', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    instrument.twist = (message) => (message === ':SENS1:CORR?' ? { reply: null } : undefined);
    const hanging = failureOf(analyzer.calibrationState());
    await clock.run(clock.sleep(50));
    const begunMs = clock.monotonicMs();
    const off = analyzer.source(false);
    await clock.run(clock.sleep(2));
    expect(instrument.settings.output).toBe(false);
    await clock.run(off);
    expect(await hanging).toMatchObject({ code: 'ANALYZER_INTERRUPTED' });
    expect(clock.monotonicMs() - begunMs).toBeLessThan(500);
    expect(instrument.visits).toBe(2);
  });

  it('goes off over a new connection when the old one is deaf', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    const dead = instrument.visits;
    instrument.twist = () => (instrument.visits === dead ? { reply: null, ignore: true } : undefined);
    const off = analyzer.source(false);
    await clock.run(off);
    expect(instrument.settings.output).toBe(false);
    expect(instrument.visits).toBe(2);
  });

  it('goes off even where the new connection obeys and says nothing', async () => {
    const { clock, instrument, analyzer } = await preparedBench();
    const dead = instrument.visits;
    instrument.twist = () => ({ reply: null, ignore: instrument.visits === dead });
    expect(await failureOf(clock.run(analyzer.source(false)))).toMatchObject({
      code: 'ANALYZER_NOT_ANSWERING',
    });
    expect(instrument.settings.output).toBe(false);
  });

  it('goes off with a closed link, whatever the signal says, and reports when it cannot', async () => {
    const { clock, instrument, analyzer, listener } = await preparedBench();
    await instrument.visitor?.close();
    await clock.run(clock.sleep(5));
    await clock.run(analyzer.source(false, AbortSignal.abort(new Error('the run was stopped'))));
    expect(instrument.settings.output).toBe(false);
    await instrument.visitor?.close();
    await listener.close();
    await clock.run(clock.sleep(5));
    expect(await failureOf(clock.run(analyzer.source(false)))).toMatchObject({ code: 'LINK_OPEN_FAILED' });
  });

  it('makes one of two calls, and takes what waits out of the way', async () => {
    const { clock, instrument, analyzer } = await preparedBench({ instrument: { sweepMs: 5000 } });
    const sweeping = failureOf(analyzer.acquire());
    const waiting = failureOf(analyzer.acquire());
    await clock.run(clock.sleep(100));
    await clock.run(Promise.all([analyzer.source(false), analyzer.source(false)]));
    expect(await sweeping).toMatchObject({ code: 'ANALYZER_INTERRUPTED' });
    expect(await waiting).toMatchObject({ code: 'ANALYZER_INTERRUPTED' });
    expect(instrument.sweeps).toBe(1);
  });
});

describe('close', () => {
  it('ends what is under way, and the analyzer can be opened again', async () => {
    const { clock, instrument, analyzer, link } = await preparedBench({ instrument: { sweepMs: 5000 } });
    const sweeping = failureOf(analyzer.acquire());
    await clock.run(clock.sleep(100));
    await clock.run(analyzer.close());
    expect(await clock.run(sweeping)).toMatchObject({ code: 'ANALYZER_INTERRUPTED' });
    expect(link.isOpen).toBe(false);
    await clock.run(analyzer.close());
    await clock.run(analyzer.identify());
    expect(instrument.visits).toBe(2);
  });
});
