import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { ScpiSession } from '../../../../drivers/analyzer/scpi-session.ts';
import type { TrafficNote } from '../../../../drivers/analyzer/scpi-wire.ts';
import { MemoryPort } from '../../../../drivers/link/memory.ts';
import { SimulatedClock } from '../../../../mocks/simulated-clock.ts';
import { failureOf } from '../../../support/analyzer-bench.ts';
import { blockOf, ScriptedInstrument, type ScriptedOptions } from '../../../support/scripted-instrument.ts';

const answerTimeoutMs = 1000;

function sessionBench(options: ScriptedOptions = {}, cut?: (bytes: Uint8Array) => Uint8Array[]) {
  const clock = new SimulatedClock();
  const port = new MemoryPort(clock, 'memory://analyzer', { latencyMs: 1, ...(cut && { cut }) });
  const instrument = new ScriptedInstrument(clock, options);
  port.listen(instrument.accept);
  const link = port.link();
  const traffic: TrafficNote[] = [];
  const session = new ScpiSession(link, clock, {
    errorQuery: ':SYST:ERR?',
    answerTimeoutMs,
    onTraffic: (note) => traffic.push(note),
  });
  return { clock, port, instrument, link, session, traffic };
}

async function openedSession(options: ScriptedOptions = {}, cut?: (bytes: Uint8Array) => Uint8Array[]) {
  const bench = sessionBench(options, cut);
  await bench.clock.run(bench.session.resynchronize());
  await bench.clock.run(bench.clock.sleep(5));
  bench.instrument.heard.length = 0;
  return bench;
}

describe('bringing into step', () => {
  it('sends LF first, proves the pairing with two values, then empties registers and queue', async () => {
    const { clock, instrument, session, traffic } = sessionBench();
    instrument.error('-222,"Data out of range"');
    const opening = await clock.run(session.resynchronize());
    await clock.run(clock.sleep(5));
    expect(opening).toEqual({
      identity: { maker: 'TESTWERK', model: 'VN-2', serial: '77', firmware: '1.0' },
      powerOn: false,
      errors: [{ code: -222, text: 'Data out of range' }],
    });
    expect(Buffer.from(traffic[0]!.bytes).toString()).toBe('\n');
    const markers = instrument.heard.filter((message) => /^\*ESE \d/.test(message));
    expect(new Set(markers).size).toBe(2);
    expect(instrument.heard.at(-1)).toBe('*CLS');
    expect(session.standing).toEqual({ kind: 'in-step' });
  });

  it('sends every message with one LF and no CR, one query each', async () => {
    const { session, traffic, clock } = await openedSession();
    await clock.run(session.askText(':OUTP?'));
    const sent = traffic
      .filter(({ direction }) => direction === 'sent')
      .map(({ bytes }) => Buffer.from(bytes).toString());
    for (const message of sent) {
      expect(message).toMatch(/^[^\r\n]*\n$/);
      expect(message.split('?').length).toBeLessThanOrEqual(2);
    }
  });

  it('notices that the instrument was switched on', async () => {
    const { clock, instrument, session } = sessionBench();
    instrument.events = 128;
    expect((await clock.run(session.resynchronize())).powerOn).toBe(true);
    expect((await clock.run(session.resynchronize())).powerOn).toBe(false);
  });

  it.each([
    ['at once', 0],
    ['late', 150],
  ])('is not misled by a greeting %s', async (_, delayMs) => {
    const { clock, instrument, session } = sessionBench();
    if (delayMs === 0) instrument.greet = 'WELCOME\r\nplease behave\r\n';
    else clock.at(clock.monotonicMs() + 103, () => instrument.say('WELCOME\r\n'));
    const opening = await clock.run(session.resynchronize());
    expect(opening.identity.serial).toBe('77');
    expect(await clock.run(session.askText(':SENS1:SWE:POIN?'))).toBe('201');
  });

  it('reads greeting and identity from one packet', async () => {
    const { clock, instrument, session } = sessionBench();
    instrument.twist = (message) =>
      message === '*IDN?' ? { reply: 'hello there\r\nTESTWERK,VN-2,77,1.0' } : undefined;
    expect((await clock.run(session.resynchronize())).identity.maker).toBe('TESTWERK');
    expect(await clock.run(session.askText(':SENS1:SWE:POIN?'))).toBe('201');
  });

  it('asks the identity again when a line with commas stood before it', async () => {
    const { clock, instrument, session } = sessionBench();
    let asked = 0;
    instrument.twist = (message) => {
      if (message !== '*IDN?') return undefined;
      asked += 1;
      return asked === 1 ? { reply: 'a,greeting,with,commas\r\nTESTWERK,VN-2,77,1.0' } : undefined;
    };
    expect((await clock.run(session.resynchronize())).identity.maker).toBe('TESTWERK');
    expect(asked).toBe(2);
  });

  it('gives up after three lines that are no identity', async () => {
    const { clock, instrument, session } = sessionBench();
    instrument.twist = (message) => (message === '*IDN?' ? { reply: '1\n2\n3\n4' } : undefined);
    expect(await failureOf(clock.run(session.resynchronize()))).toMatchObject({
      code: 'ANALYZER_OUT_OF_STEP',
    });
    expect(session.standing.kind).toBe('out-of-step');
  });

  it('ends half a line that a dead session left behind', async () => {
    const { clock, instrument, session } = sessionBench();
    instrument.leaveHalfLine('FREQ:STAR 1');
    await clock.run(session.resynchronize());
    expect(instrument.heard.slice(0, 2)).toEqual(['FREQ:STAR 1', '*IDN?']);
    const other = sessionBench();
    other.instrument.leaveHalfLine('*IDN?');
    expect((await other.clock.run(other.session.resynchronize())).identity.serial).toBe('77');
    expect(await other.clock.run(other.session.askText(':SENS1:SWE:POIN?'))).toBe('201');
  });

  it('refuses an instrument whose answers stay one behind', async () => {
    const { clock, instrument, session } = sessionBench();
    const late: string[] = ['1'];
    instrument.twist = (message) => {
      if (message === '*ESE?') late.push(String(instrument.enable));
      return message === '*ESE?' ? { reply: late.shift()! } : undefined;
    };
    const error = await failureOf(clock.run(session.resynchronize()));
    expect(['ANALYZER_OUT_OF_STEP', 'ANALYZER_NOT_ANSWERING']).toContain((error as { code?: string }).code);
    expect(session.standing.kind).toBe('out-of-step');
  });

  it('reports an instrument that connects and never answers', async () => {
    const { clock, instrument, session } = sessionBench();
    instrument.twist = () => ({ reply: null });
    const begunMs = clock.monotonicMs();
    const error = await failureOf(clock.run(session.resynchronize()));
    expect(error).toMatchObject({ code: 'ANALYZER_NOT_ANSWERING' });
    expect(error.message).toContain('only session');
    expect(clock.monotonicMs() - begunMs).toBeLessThan(5000);
  });

  it('reads at most 64 entries of a queue that never ends', async () => {
    const { clock, instrument, session } = sessionBench();
    instrument.twist = (message) => (message === ':SYST:ERR?' ? { reply: '-300,"again"' } : undefined);
    expect((await clock.run(session.resynchronize())).errors).toHaveLength(64);
  });

  it('throws LINK_OPEN_FAILED when nobody listens', async () => {
    const clock = new SimulatedClock();
    const session = new ScpiSession(new MemoryPort(clock).link(), clock, {
      errorQuery: ':SYST:ERR?',
      answerTimeoutMs,
    });
    expect(await failureOf(clock.run(session.resynchronize()))).toMatchObject({ code: 'LINK_OPEN_FAILED' });
    expect(await failureOf(clock.run(session.askText('*IDN?')))).toMatchObject({ code: 'LINK_CLOSED' });
  });
});

describe('one question at a time', () => {
  it('pairs every answer with its question, however the bytes are cut', async () => {
    await fc.assert(
      fc.asyncProperty(
        fc.array(fc.oneof(fc.uint8Array({ maxLength: 200 }), fc.integer({ min: -999, max: 999 })), {
          minLength: 1,
          maxLength: 5,
        }),
        fc.array(fc.integer({ min: 1, max: 60 }), { minLength: 1, maxLength: 8 }),
        async (answers, sizes) => {
          let turn = 0;
          const cut = (bytes: Uint8Array): Uint8Array[] => {
            const pieces: Uint8Array[] = [];
            for (let at = 0; at < bytes.length; ) {
              const size = sizes[turn++ % sizes.length] ?? 1;
              pieces.push(bytes.subarray(at, at + size));
              at += size;
            }
            return pieces;
          };
          const { clock, instrument, session } = await openedSession({}, cut);
          instrument.twist = (message) => {
            const answer = answers[Number(/\d+/.exec(message)?.[0])];
            return {
              reply: typeof answer === 'number' ? String(answer) : blockOf(answer ?? new Uint8Array()),
            };
          };
          const asked = answers.map((answer, i) =>
            typeof answer === 'number'
              ? session.askText(`:Q${i}?`).then(Number)
              : session.askBlock(`:Q${i}?`, 1000),
          );
          const got = await clock.run(Promise.all(asked));
          expect(got.map((one) => (typeof one === 'number' ? one : Array.from(one)))).toEqual(
            answers.map((one) => (typeof one === 'number' ? one : Array.from(one))),
          );
        },
      ),
      { numRuns: 60 },
    );
  });

  it('does not ask before the answer is there', async () => {
    const { clock, instrument, session } = await openedSession();
    instrument.twist = (message) => (message === ':A?' ? { reply: '1', delayMs: 300 } : { reply: '2' });
    const both = Promise.all([session.askText(':A?'), session.askText(':B?')]);
    await clock.run(clock.sleep(250));
    expect(instrument.heard).toEqual([':A?']);
    expect(await clock.run(both)).toEqual(['1', '2']);
  });

  it('refuses what would be two messages, or a question that asks nothing', async () => {
    const { clock, session } = await openedSession();
    for (const message of ['A?;B?', 'A?\nB?', 'A']) {
      expect(await failureOf(clock.run(session.askText(message)))).toMatchObject({
        code: 'ANALYZER_BAD_DIALECT',
      });
    }
    expect(await failureOf(clock.run(session.tell('A?')))).toMatchObject({ code: 'ANALYZER_BAD_DIALECT' });
  });

  it('does not mind a line end behind a block that comes late, or none', async () => {
    const { clock, instrument, session } = await openedSession();
    instrument.lineEnd = '';
    instrument.twist = (message) => ({ reply: message === ':X?' ? '#12ab' : '7\r\n' });
    expect(await clock.run(session.askBlock(':X?', 10))).toHaveLength(2);
    instrument.say('\r');
    instrument.say('\n');
    await clock.run(clock.sleep(5));
    expect(await clock.run(session.askText(':Y?'))).toBe('7');
  });
});

describe('out of step', () => {
  it('never pairs a late answer with the next question', async () => {
    const { clock, instrument, session } = await openedSession();
    instrument.twist = (message) => (message === ':SLOW?' ? { reply: '1', delayMs: 1500 } : undefined);
    const waiting = session.askText(':SENS1:SWE:POIN?').catch((error: unknown) => error);
    expect(await clock.run(waiting)).toBe('201');
    expect(await failureOf(clock.run(session.askText(':SLOW?')))).toMatchObject({
      code: 'ANALYZER_NOT_ANSWERING',
    });
    expect(await failureOf(clock.run(session.askText('*IDN?')))).toMatchObject({
      code: 'ANALYZER_OUT_OF_STEP',
    });
    await clock.run(clock.sleep(1000));
    expect(await failureOf(clock.run(session.askText('*IDN?')))).toMatchObject({
      code: 'ANALYZER_OUT_OF_STEP',
    });
    expect(instrument.heard.filter((message) => message === '*IDN?')).toEqual([]);
    await clock.run(session.resynchronize());
    expect(await clock.run(session.askText('*IDN?'))).toBe('TESTWERK,VN-2,77,1.0');
  });

  it('rejects what waits behind a question that is not answered', async () => {
    const { clock, instrument, session } = await openedSession();
    instrument.twist = (message) => (message === ':SLOW?' ? { reply: null } : undefined);
    const slow = failureOf(session.askText(':SLOW?'));
    const behind = failureOf(session.askText('*IDN?'));
    expect(await clock.run(slow)).toMatchObject({ code: 'ANALYZER_NOT_ANSWERING' });
    expect(await clock.run(behind)).toMatchObject({ code: 'ANALYZER_OUT_OF_STEP' });
  });

  it('waits longer while bytes still come, but not for ever', async () => {
    const { clock, instrument, session } = await openedSession();
    const trickle = (count: number): void => {
      for (let i = 1; i <= count; i += 1) clock.at(clock.monotonicMs() + i * 800, () => instrument.say('ab'));
    };
    instrument.twist = () => ({ reply: null });
    const answer = clock.run(session.askBlock(':X?', 1000));
    instrument.say('#16');
    trickle(3);
    expect(Buffer.from(await answer).toString()).toBe('ababab');
    const begunMs = clock.monotonicMs();
    const endless = failureOf(clock.run(session.askText(':Y?', { maxBytes: 50_000 })));
    trickle(100);
    const error = await endless;
    expect(error).toMatchObject({ code: 'ANALYZER_NOT_ANSWERING' });
    expect(clock.monotonicMs() - begunMs).toBe(3 * 1000 + 5000);
  });

  it('loses step over bytes that nobody asked for', async () => {
    const { clock, instrument, session } = await openedSession();
    instrument.say('\r\n');
    await clock.run(clock.sleep(2));
    expect(session.standing.kind).toBe('in-step');
    instrument.say('1\r\n');
    await clock.run(clock.sleep(2));
    expect(session.standing).toMatchObject({
      kind: 'out-of-step',
      because: expect.stringContaining('31 0d 0a'),
    });
  });

  it('refuses an answer that brought a second one with it', async () => {
    const { clock, instrument, session } = await openedSession();
    instrument.twist = () => ({ reply: '1\r\n201' });
    expect(await failureOf(clock.run(session.askText(':A?')))).toMatchObject({
      code: 'ANALYZER_OUT_OF_STEP',
    });
    expect(session.standing.kind).toBe('out-of-step');
  });

  it('stays in step when a waiting question is given up, and not when the one under way is', async () => {
    const { clock, instrument, session } = await openedSession();
    instrument.twist = (message) => ({ reply: message === ':A?' ? '1' : '2', delayMs: 200 });
    const giveUp = new AbortController();
    const first = session.askText(':A?');
    const second = failureOf(session.askText(':B?', { signal: giveUp.signal }));
    giveUp.abort(new Error('enough'));
    expect(await second).toMatchObject({ message: 'enough' });
    expect(await clock.run(first)).toBe('1');
    expect(session.standing.kind).toBe('in-step');
    expect(instrument.heard).toEqual([':A?']);

    const later = new AbortController();
    const third = failureOf(session.askText(':C?', { signal: later.signal }));
    await clock.run(clock.sleep(10));
    const begunMs = clock.monotonicMs();
    later.abort(new Error('no more'));
    expect(await third).toMatchObject({ message: 'no more' });
    expect(clock.monotonicMs()).toBe(begunMs);
    expect(session.standing.kind).toBe('out-of-step');
  });

  it('commands leave at once although an answer is awaited', async () => {
    const { clock, instrument, session } = await openedSession();
    instrument.twist = (message) => (message === ':SLOW?' ? { reply: '5', delayMs: 500 } : undefined);
    const slow = session.askText(':SLOW?');
    await clock.run(clock.sleep(10));
    await clock.run(session.shout([':ABOR', ':OUTP OFF']));
    await clock.run(clock.sleep(2));
    expect(instrument.heard).toEqual([':SLOW?', ':ABOR', ':OUTP OFF']);
    expect(await clock.run(slow)).toBe('5');
  });
});

describe('a link that closes', () => {
  it('rejects the question under way at once and keeps the cause', async () => {
    const { clock, instrument, session } = await openedSession();
    instrument.twist = () => ({ reply: null });
    const asked = failureOf(session.askText(':A?'));
    await clock.run(clock.sleep(10));
    const begunMs = clock.monotonicMs();
    await instrument.visitor?.close();
    expect(await clock.run(asked)).toMatchObject({
      code: 'LINK_CLOSED',
      facts: { by: 'remote', message: ':A?' },
    });
    expect(clock.monotonicMs() - begunMs).toBeLessThanOrEqual(1);
    expect(session.standing.kind).toBe('closed');
    expect(await failureOf(clock.run(session.askText(':A?')))).toMatchObject({ code: 'LINK_CLOSED' });
  });

  it('in the middle of a block gives nothing of it away', async () => {
    const { clock, instrument, session } = await openedSession();
    instrument.twist = () => ({ reply: '#3100only this', thenDrop: true });
    expect(await failureOf(clock.run(session.askBlock(':X?', 1000)))).toMatchObject({ code: 'LINK_CLOSED' });
    instrument.twist = () => undefined;
    await clock.run(session.resynchronize());
    expect(await clock.run(session.askText(':SENS1:SWE:POIN?'))).toBe('201');
  });

  it('closes by our own hand too', async () => {
    const { clock, instrument, session } = await openedSession();
    instrument.twist = () => ({ reply: null });
    const asked = failureOf(session.askText(':A?'));
    await clock.run(session.close());
    expect(await clock.run(asked)).toMatchObject({ code: 'LINK_CLOSED' });
  });

  it('that takes no more bytes is given up', async () => {
    const { clock, link, session } = await openedSession();
    link.write = () => new Promise(() => {});
    expect(await failureOf(clock.run(session.tell(':OUTP ON')))).toMatchObject({ code: 'LINK_TIMEOUT' });
    expect(session.standing.kind).toBe('out-of-step');
  });
});
