// A quirky instrument over a real socket and in real time, once: habits that a wire in memory may hide, for the
// system cuts and joins the pieces as it likes.
import { expect, it } from 'vitest';
import { ScpiAnalyzer } from '../../../../drivers/analyzer/scpi-analyzer.ts';
import { dialectNamed } from '../../../../drivers/analyzer/scpi-dialects.ts';
import { SystemClock } from '../../../../drivers/clock.ts';
import { listenTcp, TcpLink } from '../../../../drivers/link/tcp.ts';
import { sampleSetup } from '../../../support/analyzer-bench.ts';
import { QuirkyInstrument, truthOf } from '../../../support/quirky-instrument.ts';

it('measures over TCP with an instrument full of quirks, and comes back after half a block', async () => {
  const clock = new SystemClock();
  const instrument = new QuirkyInstrument(clock, {
    lineEnd: '\r\n',
    greeting: 'SWEEPBOX READY',
    numbers: 'signed',
    headerEcho: true,
    booleanWords: true,
    formatWord: 'word',
    errorForm: 'bare',
    sweepMs: 20,
    deafWhileSweeping: true,
    unknown: ['CALC:X?'],
    blockTail: '',
    lengthDigits: 9,
    pieceBytes: 3,
    halfBlockAt: 3,
  });
  const listener = await listenTcp('127.0.0.1', 0, instrument.accept);
  const analyzer = new ScpiAnalyzer(TcpLink.to('127.0.0.1', listener.port, clock), clock, {
    dialect: dialectNamed('numbered-parameter'),
    traceFormat: 'real64',
    byteOrder: 'swapped',
    answerTimeoutMs: 400,
  });
  try {
    expect((await analyzer.identify()).model).toBe('SWEEPBOX 2');
    await analyzer.prepare(sampleSetup);
    await analyzer.source(true);
    await expect(analyzer.acquire()).rejects.toMatchObject({ code: 'LINK_CLOSED' });
    await analyzer.recover();
    const { traces } = await analyzer.acquire();
    const sweep = instrument.sweeps.at(-1);
    if (!sweep) throw new Error('no sweep took place');
    for (const parameter of sampleSetup.parameters) {
      if (parameter !== 'S11' && parameter !== 'S21') continue;
      const truth = Array.from({ length: sampleSetup.points }, (_, index) =>
        truthOf(sweep, parameter, index),
      );
      expect(Array.from(traces.get(parameter) ?? [])).toEqual(truth.flat());
    }
    await analyzer.source(false);
    expect(instrument.output).toBe(false);
  } finally {
    await analyzer.close();
    await listener.close();
  }
}, 20_000);
