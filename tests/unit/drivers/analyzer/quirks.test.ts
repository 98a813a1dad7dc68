// The analyzer driver against instruments that nobody has met yet: each habit alone, then any mixture of them.
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { DriverErrorCode } from '../../../../drivers/errors.ts';
import { type AnalyzerJob, runAnalyzerJob } from '../../../support/quirky-analyzer-job.ts';
import type { InstrumentQuirks } from '../../../support/quirky-instrument-habits.ts';

/** Habits that cost nothing: the whole job is done as if there were none. */
const harmless: Record<string, AnalyzerJob> = {
  'no quirk': { quirks: {} },
  'CR LF line ends': { quirks: { lineEnd: '\r\n' } },
  'CR line ends': { quirks: { lineEnd: '\r' } },
  'a blank after each comma': { quirks: { commaBlank: true }, traceFormat: 'ascii' },
  'lower-case exponents': { quirks: { numbers: 'lower' } },
  'signed numbers with exponent': { quirks: { numbers: 'signed' } },
  'thirteen digits': { quirks: { numbers: 'long' } },
  'headers in answers': { quirks: { headerEcho: true } },
  'headers in answers, decimals': { quirks: { headerEcho: true }, traceFormat: 'ascii' },
  'a greeting': { quirks: { greeting: 'WELCOME TO SWEEPBOX 2, PORT 1' } },
  'ON and OFF': { quirks: { booleanWords: true } },
  'REAL for REAL,64': { quirks: { formatWord: 'word' } },
  'REAL for REAL,32': { quirks: { formatWord: 'word' }, traceFormat: 'real32' },
  'REAL,+64': { quirks: { formatWord: 'signed' } },
  REAL64: { quirks: { formatWord: 'glued' } },
  NORMAL: { quirks: { longWords: true } },
  SWAPPED: { quirks: { longWords: true }, byteOrder: 'swapped' },
  'errors without quotes': { quirks: { errorForm: 'bare' } },
  'errors with sign': { quirks: { errorForm: 'signed' } },
  'errors as numbers alone': { quirks: { errorForm: 'number' } },
  'an error queue of two': { quirks: { errorQueue: 2, powerOnError: true } },
  'sweeps over before the first poll': { quirks: { sweepMs: 0.5 } },
  'sweeps that take no time': { quirks: { sweepMs: 0 } },
  'deaf while sweeping': { quirks: { deafWhileSweeping: true } },
  'deaf while sweeping for 20 s': { quirks: { deafWhileSweeping: true, sweepMs: 20_000 } },
  'operation complete of before': { quirks: { staleOperationComplete: true } },
  'operation complete that only *CLS takes away': {
    quirks: { staleOperationComplete: true, completeSticks: 'until-cleared', oldDataReadable: true },
  },
  'sweep time overstated': { quirks: { statedSweepMs: 5_000 } },
  'average by N starts': { quirks: { averaging: 'start-each' }, setup: { averages: 4 } },
  'average by one start': { quirks: { averaging: 'start-all' }, setup: { averages: 4 } },
  'average by point': { quirks: { averaging: 'by-point' }, setup: { averages: 4 } },
  'frequencies in whole Hz': { quirks: { frequencyDigits: 'hertz' } },
  'no frequency axis': { quirks: { unknown: ['CALC:X?'] } },
  'no sweep time': { quirks: { unknown: ['SENS:SWE:TIME?'] } },
  'neither axis nor time nor correction': {
    quirks: { unknown: ['CALC:X?', 'SENS:SWE:TIME?', 'SENS:CORR?'] },
  },
  'no averaging mode query': {
    quirks: { unknown: ['SENS:AVER:MODE?'], averaging: 'by-point' },
    setup: { averages: 2 },
  },
  'neither sweep type nor trigger source': { quirks: { unknown: ['SENS:SWE:TYPE', 'TRIG:SOUR'] } },
  'sweep time 0': { quirks: { sweepTime: 'zero' } },
  'sweep time nan': { quirks: { sweepTime: 'nan' } },
  'sweep time 9.91E37': { quirks: { sweepTime: 'overflow' } },
  'sweep time in whole ms': { quirks: { sweepTime: 'milliseconds', sweepMs: 0.4 } },
  'blocks without line end': { quirks: { blockTail: '' } },
  'blocks padded with NUL': { quirks: { blockTail: '\0\0\0\n' } },
  'blocks and two line ends': { quirks: { blockTail: '\r\n\r\n' } },
  'nine digits of length': { quirks: { lengthDigits: 9 } },
  'one byte at a time': { quirks: { pieceBytes: 1 } },
  'a pause inside each block': { quirks: { pauseMs: 2_500, pieceBytes: 64 } },
  'slow answers': { quirks: { answerDelayMs: () => 2_000 } },
  'power on in queue and register': { quirks: { powerOnError: true, powerOnBit: true } },
  'hands at the panel, and words that nobody asked for': {
    quirks: { oldDataReadable: true },
    troubles: ['touch-start', 'touch-continuous', 'touch-select', 'chatter'],
  },
  'old traces stay readable': { quirks: { oldDataReadable: true } },
};

describe('one habit at a time, none of which may cost anything', () => {
  it.each(Object.entries(harmless))('%s', async (_, job) => {
    const { failures, acquired, instrument } = await runAnalyzerJob(job);
    expect(failures).toEqual([]);
    expect(acquired).toBe(job.troubles?.length ?? 3);
    expect(instrument.output).toBe(false);
  });
});

/** Habits that make a step impossible: the codes that may be thrown, and how many acquisitions still succeed. */
const hopeless: Record<string, { job: AnalyzerJob; codes: DriverErrorCode[]; acquired: number }> = {
  'a bandwidth that it does not have': {
    job: { quirks: { bandwidths: [300, 3000] } },
    codes: ['ANALYZER_SETTING_DIFFERS'],
    acquired: 0,
  },
  'no *OPC': {
    job: { quirks: { operationComplete: false } },
    codes: ['ANALYZER_COMMAND_REFUSED'],
    acquired: 0,
  },
  'operation complete for ever': {
    job: { quirks: { staleOperationComplete: true, completeSticks: 'for-ever', oldDataReadable: true } },
    codes: ['ANALYZER_DEVICE_ERROR'],
    acquired: 0,
  },
  'complete as soon as begun': {
    job: {
      quirks: { completeAtOnce: true, oldDataReadable: true },
      troubles: ['none', 'none', 'none', 'none'],
    },
    codes: ['ANALYZER_DEVICE_ERROR', 'ANALYZER_IMPLAUSIBLE_DATA'],
    acquired: 0,
  },
  silence: { job: { quirks: { silent: true } }, codes: ['ANALYZER_NOT_ANSWERING'], acquired: 0 },
  'garbage behind each block': {
    job: { quirks: { blockTail: 'xyz\n' } },
    codes: ['ANALYZER_OUT_OF_STEP', 'ANALYZER_BAD_ANSWER', 'ANALYZER_BAD_BLOCK'],
    acquired: 0,
  },
  'a source that stays on': {
    job: { quirks: { sourceStuck: true } },
    codes: ['ANALYZER_SETTING_DIFFERS'],
    acquired: 3,
  },
  'half a block, then a dead link': {
    job: { quirks: { halfBlockAt: 3 } },
    codes: ['LINK_CLOSED'],
    acquired: 2,
  },
  'power lost for a minute': {
    job: { quirks: { bootMs: 60_000 }, troubles: ['none', 'cut-power', 'none'] },
    codes: ['LINK_CLOSED', 'LINK_OPEN_FAILED', 'ANALYZER_NOT_ANSWERING', 'ANALYZER_POWER_CYCLED'],
    acquired: 2,
  },
  'mute for 10 s after each reconnection': {
    job: { quirks: { muteAfterReconnectMs: 10_000 }, troubles: ['none', 'drop-link', 'none'] },
    codes: ['LINK_CLOSED', 'ANALYZER_NOT_ANSWERING'],
    acquired: 2,
  },
  'a second session refused for 5 s': {
    job: { quirks: { sessions: 'refused', lingerMs: 5_000 }, troubles: ['none', 'drop-link', 'none'] },
    codes: ['LINK_CLOSED', 'LINK_OPEN_FAILED'],
    acquired: 2,
  },
  'a second session mute for 5 s': {
    job: { quirks: { sessions: 'mute', lingerMs: 5_000 }, troubles: ['none', 'drop-link', 'none'] },
    codes: ['LINK_CLOSED', 'ANALYZER_NOT_ANSWERING'],
    acquired: 2,
  },
};

describe('one habit at a time, said with the fitting code', () => {
  it.each(Object.entries(hopeless))('%s', async (_, { job, codes, acquired }) => {
    const outcome = await runAnalyzerJob(job);
    expect(outcome.failures).not.toEqual([]);
    const others = outcome.errors.filter(
      (error) => !codes.includes(error.code) && !error.message.includes('prepared'),
    );
    expect(others.map((error) => `${error.code} ${error.message}`)).toEqual([]);
    expect(outcome.acquired).toBe(acquired);
  });
});

const quirks: fc.Arbitrary<Partial<InstrumentQuirks>> = fc.record(
  {
    lineEnd: fc.constantFrom('\n', '\r\n', '\r'),
    greeting: fc.constantFrom('HELLO', '1,2,3,4', '0'),
    commaBlank: fc.boolean(),
    numbers: fc.constantFrom('plain', 'signed', 'lower', 'long'),
    headerEcho: fc.boolean(),
    booleanWords: fc.boolean(),
    formatWord: fc.constantFrom('both', 'word', 'signed', 'glued'),
    longWords: fc.boolean(),
    errorForm: fc.constantFrom('quoted', 'bare', 'number', 'signed'),
    errorQueue: fc.constantFrom(1, 2, 16),
    sweepMs: fc.constantFrom(0, 0.5, 30, 150, 4_000),
    deafWhileSweeping: fc.boolean(),
    staleOperationComplete: fc.boolean(),
    averaging: fc.constantFrom('by-point', 'start-each', 'start-all'),
    frequencyDigits: fc.constantFrom('hertz', 'fifteen'),
    unknown: fc.subarray([
      'CALC:X?',
      'SENS:SWE:TIME?',
      'SENS:SWE:TYPE',
      'TRIG:SOUR',
      'SENS:CORR?',
      'FORM:BORD?',
    ]),
    sweepTime: fc.constantFrom('stated', 'zero', 'nan', 'overflow', 'milliseconds'),
    blockTail: fc.constantFrom('\n', '\r\n', '', '\0\n'),
    lengthDigits: fc.constantFrom(0, 4, 9),
    pieceBytes: fc.constantFrom(1, 7, 1_000),
    pauseMs: fc.constantFrom(0, 700, 2_500),
    powerOnError: fc.boolean(),
    powerOnBit: fc.boolean(),
    oldDataReadable: fc.boolean(),
  },
  { requiredKeys: [] },
);

const setups = {
  setup: fc.record({ averages: fc.constantFrom(1, 3), points: fc.constantFrom(2, 11) }),
  traceFormat: fc.constantFrom('real64', 'real32', 'ascii'),
  byteOrder: fc.constantFrom('normal', 'swapped'),
} as const;

/** A sweep that is called complete at once is found out by its time, if that is known and answers are quick. */
const tellingTime: Partial<InstrumentQuirks> = {
  sweepMs: 150,
  sweepTime: 'stated',
  statedSweepMs: undefined,
  unknown: [],
  answerDelayMs: () => 0,
};

describe('any mixture of habits', () => {
  it('costs nothing as long as each of them costs nothing', async () => {
    const jobs: fc.Arbitrary<AnalyzerJob> = fc.record({ quirks, ...setups });
    await fc.assert(
      fc.asyncProperty(jobs, async (job) => {
        // Half of the queue is lost with one entry: which command was unknown cannot be told any more.
        const { failures, acquired } = await runAnalyzerJob(job);
        expect(failures).toEqual([]);
        expect(acquired).toBe(3);
      }),
      { seed: 11, numRuns: 120 },
    );
  });

  it('ends in the right traces or a typed error whatever happens', async () => {
    const rough: fc.Arbitrary<Partial<InstrumentQuirks>> = fc.record(
      {
        bandwidths: fc.constantFrom([1000], [300, 3000]),
        completeAtOnce: fc.boolean(),
        statedSweepMs: fc.constantFrom(10, 150, 6_000),
        completeSticks: fc.constantFrom('no', 'until-cleared', 'for-ever'),
        operationComplete: fc.constantFrom(true, true, true, false),
        blockTail: fc.constantFrom('\n', '\n\n', 'xyz\n', '12\n'),
        halfBlockAt: fc.integer({ min: 1, max: 8 }),
        sessions: fc.constantFrom('any', 'refused', 'mute'),
        lingerMs: fc.constantFrom(0, 300, 5_000),
        muteAfterReconnectMs: fc.constantFrom(0, 2_000, 10_000),
        bootMs: fc.constantFrom(100, 3_000, 60_000),
        sourceStuck: fc.boolean(),
        answerDelayMs: fc.constantFrom(
          () => 0,
          () => 400,
          (message: number) => (message % 13 === 0 ? 3_400 : 0),
          (message: number) => (message % 29 === 0 ? 8_000 : 0),
        ),
      },
      { requiredKeys: [] },
    );
    const jobs: fc.Arbitrary<AnalyzerJob> = fc.record({
      quirks: fc.tuple(quirks, rough).map(([a, b]) => ({ ...a, ...b, ...(b.completeAtOnce && tellingTime) })),
      ...setups,
      troubles: fc.array(
        fc.constantFrom(
          'none',
          'drop-link',
          'cut-power',
          'touch-points',
          'touch-continuous',
          'touch-select',
          'touch-start',
          'chatter',
        ),
        { minLength: 3, maxLength: 6 },
      ),
    });
    await fc.assert(
      fc.asyncProperty(jobs, async (job) => {
        await runAnalyzerJob(job);
      }),
      { seed: 12, numRuns: 200 },
    );
  });
});
