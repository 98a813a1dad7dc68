// A few cases over real sockets and real time: what a wire in memory cannot show, that connections are
// opened, cut and opened anew. Instruments sweep in 20 ms here.
import { afterEach, describe, expect, it } from 'vitest';
import { ScpiAnalyzer } from '../../../../drivers/analyzer/scpi-analyzer.ts';
import { dialectNamed } from '../../../../drivers/analyzer/scpi-dialects.ts';
import { SystemClock } from '../../../../drivers/clock.ts';
import { listenTcp, TcpLink } from '../../../../drivers/link/tcp.ts';
import { failureOf, sampleSetup } from '../../../support/analyzer-bench.ts';
import { ScriptedInstrument } from '../../../support/scripted-instrument.ts';

const endings: (() => Promise<void>)[] = [];

afterEach(async () => {
  for (const end of endings.splice(0)) await end();
});

async function tcpBench(points = 1001) {
  const clock = new SystemClock();
  const instrument = new ScriptedInstrument(clock, { sweepMs: 20 });
  const listener = await listenTcp('127.0.0.1', 0, instrument.accept);
  const analyzer = new ScpiAnalyzer(TcpLink.to('127.0.0.1', listener.port, clock), clock, {
    dialect: dialectNamed('numbered-parameter'),
    traceFormat: 'real64',
    byteOrder: 'swapped',
    answerTimeoutMs: 400,
  });
  endings.push(async () => {
    await analyzer.close();
    await listener.close();
  });
  await analyzer.identify();
  await analyzer.prepare({ ...sampleSetup, points });
  return { clock, instrument, listener, analyzer };
}

describe('over TCP', () => {
  it('reads traces longer than a packet, sweep after sweep', async () => {
    const { instrument, analyzer } = await tcpBench(5001);
    for (let sweep = 1; sweep <= 3; sweep += 1) {
      const { traces } = await analyzer.acquire();
      expect(traces.get('S21')).toHaveLength(10_002);
      expect(Array.from(traces.get('S21')!.slice(-2))).toEqual(instrument.value('S21', 5000));
      expect(instrument.sweeps).toBe(sweep);
    }
    expect(instrument.visits).toBe(1);
  });

  it('comes back after the link was cut in the middle of a block', async () => {
    const { instrument, analyzer } = await tcpBench();
    instrument.twist = (message) =>
      message === ':CALC1:DATA? SDATA' ? { reply: '#516016half of it', thenDrop: true } : undefined;
    expect(await failureOf(analyzer.acquire())).toMatchObject({ code: 'LINK_CLOSED' });
    instrument.twist = () => undefined;
    await analyzer.recover();
    expect((await analyzer.acquire()).traces.size).toBe(2);
    expect(instrument.visits).toBe(2);
  });

  it('switches the source off while a question hangs', async () => {
    const { clock, instrument, analyzer } = await tcpBench();
    await analyzer.source(true);
    instrument.twist = (message) => (message === ':SENS1:CORR?' ? { reply: null } : undefined);
    const hanging = failureOf(analyzer.calibrationState());
    await clock.sleep(20);
    const begunMs = clock.monotonicMs();
    const off = analyzer.source(false);
    await clock.sleep(60);
    expect(instrument.settings.output).toBe(false);
    await off;
    expect(clock.monotonicMs() - begunMs).toBeLessThan(1500);
    expect(await hanging).toMatchObject({ code: 'ANALYZER_INTERRUPTED' });
  });

  it('is refused by a port where nobody listens', async () => {
    const { analyzer, listener } = await tcpBench();
    await listener.close();
    expect(await failureOf(analyzer.recover())).toMatchObject({ code: 'LINK_OPEN_FAILED' });
  });
});
