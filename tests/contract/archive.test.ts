// What every archive must do, whatever stands behind it: one body for all implementations.
import fc from 'fast-check';
import { afterEach, beforeEach, describe, expect, it } from 'vitest';
import type { Archive, NewRun, SampleFilter } from '../../daemon/archive/archive.ts';
import { type ArchiveOptions, InThreadArchive } from '../../daemon/archive/in-thread-archive.ts';
import { openArchive } from '../../daemon/archive/open-archive.ts';
import { hashSamples } from '../../daemon/archive/run-hash.ts';
import { freshPath } from '../unit/daemon/archive/fresh-path.ts';
import { event, failure, newRun, sample, segment, setup, startRun } from '../unit/daemon/archive/records.ts';

type Open = (options?: ArchiveOptions) => Promise<Archive>;

const implementations: [string, Open][] = [
  ['in thread, in memory', async (options) => InThreadArchive.open(':memory:', options)],
  ['in thread, in a file', async (options) => InThreadArchive.open(freshPath(), options)],
  ['on a worker, in a file', (options) => openArchive(freshPath(), options)],
];

describe.each(implementations)('archive %s', (_name, open) => {
  let archive: Archive;

  beforeEach(async () => {
    archive = await open();
  });
  afterEach(() => archive.close());

  describe('runs', () => {
    it('are numbered 1, 2, 3 and have each a UUID of their own', async () => {
      const made = [
        await archive.createRun(newRun),
        await archive.createRun(newRun),
        await archive.createRun(newRun),
      ];
      expect(made.map(({ number }) => number)).toEqual([1, 2, 3]);
      expect(new Set(made.map(({ uuid }) => uuid)).size).toBe(3);
      // RFC 9562, section 5.4: version 4, variant 10.
      const version4 = /^[0-9a-f]{8}-[0-9a-f]{4}-4[0-9a-f]{3}-[89ab][0-9a-f]{3}-[0-9a-f]{12}$/;
      for (const { uuid } of made) expect(uuid).toMatch(version4);
    });

    it('take their UUID from the maker handed in', async () => {
      let made = 0;
      const seeded = await open({ newUuid: () => `night-${++made}` });
      expect(await seeded.createRun(newRun)).toEqual({ number: 1, uuid: 'night-1' });
      expect(await seeded.createRun(newRun)).toEqual({ number: 2, uuid: 'night-2' });
      await seeded.close();
    });

    it('are read back as they were frozen', async () => {
      const { number, uuid } = await archive.createRun(newRun);
      expect(await archive.run(number)).toEqual({ ...newRun, number, uuid, state: 'running' });
    });

    it('keep the gain reference with its values', async () => {
      const gainReference = {
        runUuid: 'a',
        runNumber: 3,
        antenna: 'dipole',
        frequenciesHz: [800e6, 900_000_000.5],
        realizedGainDbi: [2.15, 0.1 + 0.2],
        levelDb: [-41.5, -42],
      };
      const { number } = await archive.createRun({ ...newRun, kind: 'reference', gainReference });
      expect((await archive.run(number)).gainReference).toEqual(gainReference);
      expect((await archive.run(number)).kind).toBe('reference');
    });

    it('are listed newest first, with the count of their samples', async () => {
      const first = await startRun(archive);
      await archive.createRun({ ...newRun, antenna: { name: 'patch', revision: 'A' } });
      await archive.addSample(first, sample(1));
      await archive.addSample(first, sample(2));
      await archive.endRun(first, 'interrupted', 99.5, 'wind');
      const [newest, oldest, ...rest] = await archive.runs();
      expect(newest).toMatchObject({ number: 2, samples: 0, antenna: { name: 'patch', revision: 'A' } });
      expect(newest).not.toHaveProperty('endedWallMs');
      expect(oldest).toMatchObject({ number: 1, samples: 2, state: 'interrupted', endedWallMs: 99.5 });
      expect(rest).toEqual([]);
    });

    it('end with a reason, or without one', async () => {
      const [one, two] = [await archive.createRun(newRun), await archive.createRun(newRun)];
      await archive.endRun(one.number, 'failed', 5, 'the mast fell');
      await archive.endRun(two.number, 'complete', 6);
      const failed = await archive.run(one.number);
      expect(failed).toMatchObject({ state: 'failed', endedWallMs: 5, reason: 'the mast fell' });
      const complete = await archive.run(two.number);
      expect(complete).toMatchObject({ state: 'complete', endedWallMs: 6 });
      expect(complete).not.toHaveProperty('reason');
    });

    it('run again when a segment is added to an interrupted one', async () => {
      const run = await startRun(archive);
      await archive.endRun(run, 'interrupted', 5, 'wind');
      await archive.addSegment(run, { ...segment, segment: 2, reason: 'resumed' });
      const resumed = await archive.run(run);
      expect(resumed.state).toBe('running');
      expect(resumed).not.toHaveProperty('endedWallMs');
      expect(resumed).not.toHaveProperty('reason');
      await archive.addSample(run, sample(1, { segment: 2 }));
    });

    it.each(['complete', 'failed'] as const)('stay %s and take no samples then', async (state) => {
      const run = await startRun(archive);
      await archive.endRun(run, state, 5);
      await failure('DEFECT', () => archive.endRun(run, 'interrupted', 6));
      await failure('DEFECT', () => archive.addSegment(run, { ...segment, segment: 2 }));
      await failure('DEFECT', () => archive.addSample(run, sample(1)));
      expect(await archive.run(run)).toMatchObject({ state, endedWallMs: 5 });
    });

    it('of a number that was never given do not exist', async () => {
      await archive.createRun(newRun);
      const calls: (() => Promise<unknown>)[] = [
        () => archive.run(2),
        () => archive.segments(2),
        () => archive.setups(2),
        () => archive.samples(2),
        () => archive.events(2),
        () => archive.addSegment(2, segment),
        () => archive.addSetup(2, setup),
        () => archive.addSample(2, sample(1)),
        () => archive.addEvent(2, event),
        () => archive.endRun(2, 'complete', 1),
      ];
      for (const call of calls) {
        expect((await failure('ARCHIVE_NO_SUCH_RUN', call)).facts).toMatchObject({ run: 2 });
      }
    });
  });

  describe('samples', () => {
    it('are read back as they were, in order of sequence', async () => {
      const run = await startRun(archive);
      for (const sequence of [2, 1, 3]) await archive.addSample(run, sample(sequence));
      expect(await archive.samples(run)).toEqual([sample(1), sample(2), sample(3)]);
    });

    it('keep every bit of their traces', async () => {
      const run = await startRun(archive);
      // −0, smallest subnormal, a signalling and a negative NaN, −∞, largest finite (IEEE 754 patterns).
      const bits = BigUint64Array.of(
        0x8000000000000000n,
        1n,
        0x7ff0000000000001n,
        0xfff8000000000123n,
        0xfff0000000000000n,
        0x7fefffffffffffffn,
      );
      await archive.addSample(run, sample(1, { traces: new Map([['S21', new Float64Array(bits.buffer)]]) }));
      const [read] = await archive.samples(run);
      expect(new BigUint64Array(read!.traces.get('S21')!.buffer as ArrayBuffer)).toEqual(bits);
    });

    it('keep every number of their place and time', async () => {
      const run = await startRun(archive);
      let sequence = 0;
      // −0 is no other angle than 0, and is not kept; that of a trace is.
      const real = fc.double({ noNaN: true, noDefaultInfinity: true }).map((x) => (x === 0 ? 0 : x));
      const write = fc.asyncProperty(fc.array(real, { minLength: 5, maxLength: 5 }), async (numbers) => {
        const [a, b, c, d, e] = numbers as [number, number, number, number, number];
        sequence += 1;
        const written = sample(sequence, {
          target: { azimuth: a, 'roll "of" the AUT': b },
          angleDeg: c,
          startMonotonicMs: Math.min(d, e),
          stopMonotonicMs: Math.max(d, e),
          timeLaw: { kind: 'linear', firstMs: Math.min(a, b), lastMs: Math.max(a, b) },
          track: [
            { monotonicMs: d, position: { azimuth: e } },
            { monotonicMs: e, position: {} },
          ],
        });
        await archive.addSample(run, written);
        const read = await archive.samples(run);
        expect(read.at(-1)).toEqual(written);
      });
      await fc.assert(write, { numRuns: 25 });
    });

    it('are kept as they were when handed over', async () => {
      const run = await startRun(archive);
      const values = Float64Array.of(1, 2, 3, 4, 5, 6);
      const position = { azimuth: 5 };
      const written = archive.addSample(
        run,
        sample(1, { target: position, traces: new Map([['S21', values]]) }),
      );
      values.fill(0);
      position.azimuth = 0;
      await written;
      expect(values.length).toBe(6);
      const [read] = await archive.samples(run);
      expect(read!.target).toEqual({ azimuth: 5 });
      expect(read!.traces.get('S21')).toEqual(Float64Array.of(1, 2, 3, 4, 5, 6));
    });

    it('are picked by purpose, by cut and by both', async () => {
      const run = await startRun(archive);
      await archive.addSample(run, sample(1, { purpose: 'tie' }));
      await archive.addSample(run, sample(2));
      await archive.addSample(run, sample(3, { purpose: 'closure' }));
      await archive.addSample(run, sample(4, { cut: 'elevation' }));
      const picked = async (filter: SampleFilter) =>
        (await archive.samples(run, filter)).map(({ sequence }) => sequence);
      expect(await picked({})).toEqual([1, 2, 3, 4]);
      expect(await picked({ purposes: ['tie', 'closure'] })).toEqual([1, 3]);
      expect(await picked({ cut: 'elevation' })).toEqual([4]);
      expect(await picked({ purposes: ['cut'], cut: 'azimuth' })).toEqual([2]);
      expect(await picked({ purposes: [] })).toEqual([]);
      expect(await picked({ cut: '' })).toEqual([]);
    });

    it('belong to their run alone', async () => {
      const [one, two] = [await startRun(archive), await startRun(archive)];
      await archive.addSample(one, sample(1));
      await archive.addSample(two, sample(1, { angleDeg: 9 }));
      expect((await archive.samples(one)).map(({ angleDeg }) => angleDeg)).toEqual([sample(1).angleDeg]);
      expect((await archive.samples(two)).map(({ angleDeg }) => angleDeg)).toEqual([9]);
    });

    it('are never altered: the same sequence again is refused and changes nothing', async () => {
      const run = await startRun(archive);
      await archive.addSample(run, sample(1));
      const error = await failure('DEFECT', () => archive.addSample(run, sample(1, { angleDeg: 9 })));
      expect(error.facts).toMatchObject({ run, sequence: 1 });
      expect(error.message).toContain('samples are never altered');
      expect(error.cause).toBeInstanceOf(Error);
      expect(await archive.samples(run)).toEqual([sample(1)]);
    });

    it.each([
      ['a segment that was not added', { segment: 2 }],
      ['a setup that was not added', { setup: 2 }],
      [
        'traces of another length than the grid of their setup',
        { traces: new Map([['S21' as const, new Float64Array(8)]]) },
      ],
      ['an angle that is no number', { angleDeg: Number.NaN }],
      ['a target without end', { target: { azimuth: Number.POSITIVE_INFINITY } }],
      ['an end before its start', { stopMonotonicMs: 0 }],
    ])('are refused with %s', async (_what, over) => {
      const run = await startRun(archive);
      await failure('DEFECT', () => archive.addSample(run, sample(1, over)));
      expect(await archive.samples(run)).toEqual([]);
      await archive.addSample(run, sample(1));
    });

    it('have one hash before they are written and after they are read', async () => {
      const run = await startRun(archive);
      const written = [sample(1, { purpose: 'tie', angleDeg: -0 }), sample(2), sample(3)];
      for (const one of written) await archive.addSample(run, one);
      expect(hashSamples(await archive.samples(run))).toBe(hashSamples(written));
    });
  });

  describe('segments, setups and events', () => {
    it('are read back as they were, in order', async () => {
      const { number: run } = await archive.createRun(newRun);
      const second = { ...segment, segment: 2, reason: 'resumed', epochMonotonicMs: -4.5 };
      const plain = { ...setup, setup: 2, calibration: { correctionOn: false } };
      await archive.addSegment(run, segment);
      await archive.addSegment(run, second);
      await archive.addSetup(run, setup);
      await archive.addSetup(run, plain);
      expect(await archive.segments(run)).toEqual([segment, second]);
      expect(await archive.setups(run)).toEqual([setup, plain]);
    });

    it('are added once', async () => {
      const run = await startRun(archive);
      await failure('DEFECT', () => archive.addSegment(run, { ...segment, reason: 'again' }));
      await failure('DEFECT', () => archive.addSetup(run, setup));
      expect(await archive.segments(run)).toEqual([segment]);
    });

    it('events keep the order in which they came, not that of their clocks', async () => {
      const run = await startRun(archive);
      const later = { ...event, wallMs: 1, text: 'wall time went back', facts: { list: [1, 'two', null] } };
      await archive.addEvent(run, event);
      await archive.addEvent(run, later);
      await archive.endRun(run, 'complete', 7);
      await archive.addEvent(run, { ...event, kind: 'ended' });
      expect(await archive.events(run)).toEqual([event, later, { ...event, kind: 'ended' }]);
    });

    it('an event is not lost for a fact that JSON has no word for', async () => {
      const run = await startRun(archive);
      const facts = {
        sigma: Number.NaN,
        reach: Number.NEGATIVE_INFINITY,
        count: 3n,
        levels: Float64Array.of(1, 2),
        first: new Error('link closed'),
      };
      await archive.addEvent(run, { ...event, facts });
      const [read] = await archive.events(run);
      expect(read!.facts).toEqual({
        sigma: 'NaN',
        reach: '-Infinity',
        count: '3',
        levels: [1, 2],
        first: 'link closed',
      });
    });
  });

  it('answers many calls at once, each with its own result', async () => {
    const run = await startRun(archive);
    const sequences = Array.from({ length: 40 }, (_, i) => i + 1);
    const counts = await Promise.all(
      sequences.map(async (sequence) => {
        const written = archive.addSample(run, sample(sequence));
        const read = archive.samples(run);
        await written;
        return (await read).length;
      }),
    );
    // A read asked for after a write sees it: calls are executed in the order in which they are made.
    expect(counts).toEqual(sequences);
  });

  it.each<[string, Partial<NewRun>]>([
    ['a plan that is not there', { plan: undefined }],
    ['a range file with NaN', { rangeFile: { lengthM: Number.NaN } }],
    ['a kind nobody knows', { kind: 'other' as NewRun['kind'] }],
    ['a plan that holds a function', { plan: () => 1 }],
  ])('refuses a run with %s, gives it no number, and goes on', async (_what, over) => {
    await failure('DEFECT', () => archive.createRun({ ...newRun, ...over }));
    expect((await archive.createRun(newRun)).number).toBe(1);
  });

  it('refuses a UUID that is there already', async () => {
    const repeating = await open({ newUuid: () => 'same' });
    await repeating.createRun(newRun);
    await failure('DEFECT', () => repeating.createRun(newRun));
    await repeating.close();
  });

  it('closes after what was asked before, closes twice, and refuses calls from then on', async () => {
    const run = await startRun(archive);
    const written = archive.addSample(run, sample(1));
    const closed = archive.close();
    await expect(written).resolves.toBeUndefined();
    await closed;
    await archive.close();
    await failure('ARCHIVE_UNUSABLE', () => archive.addSample(run, sample(2)));
    await failure('ARCHIVE_UNUSABLE', () => archive.runs());
  });
});
