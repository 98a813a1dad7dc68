// The order of things in a run, on devices that fail on order; archive in memory, virtual time.
import { afterEach, describe, expect, it } from 'vitest';
import type { SampleRecord } from '../../../../daemon/archive/archive.ts';
import { InThreadArchive } from '../../../../daemon/archive/in-thread-archive.ts';
import { DaemonError } from '../../../../daemon/errors.ts';
import type { PlannedStep } from '../../../../daemon/plan/expand.ts';
import { type AxisRest, lastRest } from '../../../../daemon/run/axis-rest.ts';
import type { RunEvent } from '../../../../daemon/run/events.ts';
import { triesPerPosition } from '../../../../daemon/run/retry-table.ts';
import { RunLoop, type RunOrder, type RunOutcome } from '../../../../daemon/run/run-loop.ts';
import { DriverError, type DriverErrorCode } from '../../../../drivers/errors.ts';
import { SimulatedClock } from '../../../../mocks/simulated-clock.ts';
import {
  type Diary,
  FakeAnalyzer,
  FakePositioner,
  fakeAxis,
  type Trouble,
} from '../../../support/fake-devices.ts';

const archives: InThreadArchive[] = [];
afterEach(async () => {
  for (const archive of archives.splice(0)) await archive.close();
});

interface Scene {
  analyzer?: Trouble;
  positioner?: Trouble;
  homing?: 'switch' | 'none';
  steps?: PlannedStep[];
  lastRest?: AxisRest;
  during?: (event: RunEvent, tools: { stop: AbortController; clock: SimulatedClock }) => void;
  archive?: (archive: InThreadArchive) => void;
}

interface Result {
  outcome: RunOutcome;
  diary: Diary;
  events: RunEvent[];
  archive: InThreadArchive;
}

async function run(scene: Scene = {}): Promise<Result> {
  const clock = new SimulatedClock();
  const diary: Diary = [];
  const positioner = new FakePositioner(clock, diary, [fakeAxis(scene.homing)], scene.positioner);
  const analyzer = new FakeAnalyzer(
    clock,
    diary,
    () => (positioner.at['azimuth'] ?? 0) + 0.5,
    scene.analyzer,
  );
  const archive = InThreadArchive.open(':memory:');
  archives.push(archive);
  scene.archive?.(archive);
  const order = {
    ...orderOf(scene.steps ?? steps(3)),
    ...(scene.lastRest ? { lastRest: scene.lastRest } : {}),
  };
  const loop = new RunLoop({ analyzer, positioner }, archive, clock, order);
  const stop = new AbortController();
  const events: RunEvent[] = [];
  loop.events$.subscribe((event) => {
    events.push(event);
    scene.during?.(event, { stop, clock });
  });
  const outcome = await clock.run(loop.execute(stop.signal));
  return { outcome, diary, events, archive };
}

function steps(count: number): PlannedStep[] {
  return Array.from({ length: count }, (_, i) => ({
    purpose: 'cut',
    cut: 'azimuth',
    axis: 'azimuth',
    angleDeg: 10 * i,
    target: { azimuth: 10 * i },
    component: 'co',
  }));
}

function orderOf(planned: PlannedStep[]): RunOrder {
  return {
    record: {
      kind: 'pattern',
      antenna: { name: 'gauge antenna', revision: 'B' },
      range: 'meadow',
      planText: 'plan',
      plan: {},
      rangeText: 'range',
      rangeFile: {},
    },
    sweep: {
      startHz: 1e9,
      stopHz: 2e9,
      points: 2,
      ifBandwidthHz: 1000,
      powerDbm: 0,
      averages: 1,
      parameters: ['S21', 'S11'],
    },
    steps: planned,
    motionMs: planned.map(() => 100),
    boresight: { azimuth: 0 },
    autPort: 1,
  };
}

/** Trouble of one code at the n-th time of one act. */
function failing(act: string, code: DriverErrorCode, ...counts: number[]): Trouble {
  return (now, count) => {
    if (now === act && counts.includes(count)) throw new DriverError(code, `${act} failed on order`);
  };
}

function announced(events: readonly RunEvent[]): SampleRecord[] {
  return events.flatMap((event) => (event.kind === 'sample' ? [event.sample] : []));
}

describe('a run without trouble', () => {
  it('keeps every sample in order and ends with motors still and source off', async () => {
    const { outcome, diary, events, archive } = await run();
    expect(outcome.state).toBe('complete');
    expect(outcome.unconfirmed).toEqual([]);
    expect(diary).toEqual([
      'positioner identify',
      'analyzer identify',
      'analyzer prepare',
      'positioner home',
      'analyzer source on',
      'positioner move 0',
      'analyzer acquire',
      'positioner move 10',
      'analyzer acquire',
      'positioner move 20',
      'analyzer acquire',
      'positioner stop',
      'analyzer source off',
    ]);
    const stored = await archive.samples(outcome.run.number);
    expect(stored.map((sample) => [sample.sequence, sample.angleDeg, sample.attempt])).toEqual([
      [1, 0, 1],
      [2, 10, 1],
      [3, 20, 1],
    ]);
    expect(announced(events)).toEqual(stored);
    expect((await archive.run(outcome.run.number)).state).toBe('complete');
  });

  it('announces a sample only once it is durable, and sweeps again only then', async () => {
    const order: string[] = [];
    const { diary } = await run({
      archive(archive) {
        const addSample = archive.addSample.bind(archive);
        archive.addSample = async (number, sample) => {
          order.push(`begin ${sample.sequence}`);
          await Promise.resolve();
          await addSample(number, sample);
          order.push(`durable ${sample.sequence}`);
        };
      },
      during(event) {
        if (event.kind === 'sample') order.push(`announced ${event.sample.sequence}`);
      },
    });
    expect(diary.filter((line) => line === 'analyzer acquire')).toHaveLength(3);
    expect(order).toEqual([1, 2, 3].flatMap((n) => [`begin ${n}`, `durable ${n}`, `announced ${n}`]));
  });

  it('says how long is left, falling to nothing', async () => {
    const { events } = await run({ steps: steps(5) });
    const left = events.flatMap((event) => (event.kind === 'sample' ? [event.leftMs] : []));
    // Five steps of 150 ms each, the prediction is exact.
    expect(left.map(Math.round)).toEqual([600, 450, 300, 150, 0]);
  });
});

describe('trouble that passes', () => {
  it('takes garbage again, stores nothing of it, and leaves the bytes in the events', async () => {
    const { outcome, archive, events } = await run({
      analyzer: (act, count) => {
        if (act === 'acquire' && (count === 2 || count === 3)) {
          throw new DriverError('ANALYZER_BAD_BLOCK', 'no block', { bytesHex: 'de ad' });
        }
      },
    });
    expect(outcome.state).toBe('complete');
    const stored = await archive.samples(outcome.run.number);
    expect(stored.map((sample) => [sample.angleDeg, sample.attempt])).toEqual([
      [0, 1],
      [10, 3],
      [20, 1],
    ]);
    const retries = (await archive.events(outcome.run.number)).filter((event) => event.kind === 'retry');
    expect(retries).toHaveLength(2);
    expect(retries[0]?.facts).toMatchObject({ code: 'ANALYZER_BAD_BLOCK', bytesHex: 'de ad' });
    expect(events.filter((event) => event.kind === 'retry')).toHaveLength(2);
  });

  it('revisits from the approach side after a move that failed', async () => {
    const { diary } = await run({ positioner: failing('move', 'POSITIONER_WRONG_PLACE', 2) });
    expect(diary.filter((line) => line.startsWith('positioner move'))).toEqual([
      'positioner move 0',
      'positioner move 10',
      'positioner move 10 again',
      'positioner move 20',
    ]);
  });

  it('opens a new segment with a tie after the analyzer was switched off and on', async () => {
    const { outcome, archive, diary } = await run({
      analyzer: failing('acquire', 'ANALYZER_POWER_CYCLED', 2),
    });
    expect(outcome.state).toBe('complete');
    expect(diary).toContain('analyzer recover');
    const stored = await archive.samples(outcome.run.number);
    expect(stored.map((sample) => [sample.segment, sample.purpose, sample.angleDeg])).toEqual([
      [1, 'cut', 0],
      [2, 'tie', 0],
      [2, 'cut', 10],
      [2, 'cut', 20],
    ]);
    expect(stored.map((sample) => sample.sequence)).toEqual([1, 2, 3, 4]);
    expect(await archive.segments(outcome.run.number)).toHaveLength(2);
  });

  it('waits for an analyzer that is away for minutes', async () => {
    let away = 12;
    const { outcome } = await run({
      analyzer: (act, count) => {
        if (act === 'acquire' && count === 1) throw new DriverError('LINK_CLOSED', 'gone');
        if (act === 'recover' && away-- > 0) throw new DriverError('LINK_OPEN_FAILED', 'not yet');
      },
    });
    expect(outcome.state).toBe('complete');
  });

  it('homes and ties again after a controller restart', async () => {
    const { outcome, archive, diary } = await run({
      positioner: failing('move', 'POSITIONER_RESTARTED', 2),
    });
    expect(outcome.state).toBe('complete');
    const restart = diary.lastIndexOf('positioner identify');
    expect(diary.slice(restart, restart + 7)).toEqual([
      'positioner identify',
      'positioner home',
      'analyzer source on',
      'positioner move 0 again',
      'analyzer acquire',
      'positioner move 10 again',
      'analyzer acquire',
    ]);
    const [, second] = await archive.segments(outcome.run.number);
    expect(second?.reason).toContain('POSITIONER_RESTARTED');
  });
});

describe('axes without a home switch', () => {
  const rest = (azimuth: number, known = true) => ({ run: 7, position: { azimuth }, known });

  it('refuses a count that is not where the last run left the axes, before anything moves', async () => {
    const failure = run({ homing: 'none', lastRest: rest(45) }).catch((error: unknown) => error);
    expect(await failure).toMatchObject({
      code: 'POSITIONER_REFERENCE_LOST',
      facts: { leftDeg: 45, run: 7 },
    });
    const unknown = run({ homing: 'none', lastRest: rest(0, false) }).catch((error: unknown) => error);
    expect(await unknown).toMatchObject({ code: 'POSITIONER_REFERENCE_LOST' });
  });

  it('goes on from where the last run left them, and leaves word of its own end', async () => {
    const { outcome, archive } = await run({ homing: 'none', lastRest: rest(0.05) });
    expect(outcome.state).toBe('complete');
    const last = (await archive.events(outcome.run.number)).findLast((event) => event.kind === 'rest');
    expect(last?.facts).toEqual({ position: { azimuth: 20 }, known: true });
    expect(await lastRest(archive, 'meadow')).toEqual({
      run: outcome.run.number,
      position: { azimuth: 20 },
      known: true,
    });
    expect(await lastRest(archive, 'another range')).toBeUndefined();
  });

  it('does not ask axes that home themselves', async () => {
    const { outcome } = await run({ homing: 'switch', lastRest: rest(45) });
    expect(outcome.state).toBe('complete');
  });

  it('takes the last sample for the rest of a process that died', async () => {
    const { outcome, archive } = await run({ homing: 'none' });
    const events = archive.events.bind(archive);
    archive.events = async (number) => (await events(number)).filter((event) => event.kind !== 'rest');
    expect(await lastRest(archive, 'meadow')).toMatchObject({
      run: outcome.run.number,
      position: { azimuth: 20 },
    });
  });
});

describe('trouble that stays', () => {
  it('gives up at a position after so many tries, resumable and safe', async () => {
    const { outcome, diary } = await run({
      analyzer: failing(
        'acquire',
        'ANALYZER_IMPLAUSIBLE_DATA',
        ...Array.from({ length: 99 }, (_, i) => i + 2),
      ),
    });
    expect(outcome.state).toBe('interrupted');
    expect((outcome.error as DaemonError).code).toBe('RUN_GAVE_UP');
    expect(diary.filter((line) => line === 'analyzer acquire')).toHaveLength(1 + triesPerPosition);
    expect(diary.slice(-2)).toEqual(['positioner stop', 'analyzer source off']);
  });

  it('gives up when an axis cannot be homed again', async () => {
    const { outcome, diary } = await run({
      homing: 'none',
      positioner: failing('move', 'POSITIONER_RESTARTED', 2),
    });
    expect(outcome.state).toBe('interrupted');
    expect(outcome.error).toMatchObject({ code: 'POSITIONER_RESTARTED' });
    expect(diary.filter((line) => line.startsWith('positioner move'))).toHaveLength(2);
    expect(diary.slice(-2)).toEqual(['positioner stop', 'analyzer source off']);
  });

  it.each([
    'POSITIONER_ALARM',
    'POSITIONER_HELD',
    'POSITIONER_STALLED',
    'ANALYZER_IDENTITY_CHANGED',
  ] as const)('does not try again after %s', async (code) => {
    const { outcome, diary } = await run({ positioner: failing('move', code, 2) });
    expect(outcome.error).toMatchObject({ code });
    expect(diary.filter((line) => line.startsWith('positioner move'))).toHaveLength(2);
  });

  it('says so when a stop is not confirmed', async () => {
    const { outcome, archive, events } = await run({
      positioner: failing('stop', 'POSITIONER_STOP_UNCONFIRMED', 1),
    });
    expect(outcome.unconfirmed).toHaveLength(1);
    expect(events.some((event) => event.kind === 'trouble')).toBe(true);
    const notes = await archive.events(outcome.run.number);
    expect(notes.some((note) => note.kind === 'trouble')).toBe(true);
  });

  it('switches the source off although the controller cannot be stopped, and the other way round', async () => {
    const first = await run({ positioner: failing('stop', 'POSITIONER_STOP_UNCONFIRMED', 1) });
    expect(first.diary).toContain('analyzer source off');
    const second = await run({ analyzer: failing('source off', 'LINK_CLOSED', 1) });
    expect(second.diary).toContain('positioner stop');
    expect(second.outcome.unconfirmed).toHaveLength(1);
  });

  it('creates no run when a device does not answer, and stops both', async () => {
    const clock = new SimulatedClock();
    const diary: Diary = [];
    const positioner = new FakePositioner(clock, diary, [fakeAxis()]);
    const analyzer = new FakeAnalyzer(
      clock,
      diary,
      () => 1,
      failing('prepare', 'ANALYZER_SETTING_DIFFERS', 1),
    );
    const archive = InThreadArchive.open(':memory:');
    archives.push(archive);
    const loop = new RunLoop({ analyzer, positioner }, archive, clock, orderOf(steps(1)));
    const failure = clock.run(loop.execute(new AbortController().signal));
    await expect(failure).rejects.toMatchObject({ code: 'ANALYZER_SETTING_DIFFERS' });
    expect(await archive.runs()).toEqual([]);
    expect(diary.slice(-2)).toEqual(['positioner stop', 'analyzer source off']);
    expect(diary.some((line) => line.startsWith('positioner move'))).toBe(false);
  });

  it('stops on request in the middle of a move: interrupted, still, source off', async () => {
    const { outcome, diary, archive } = await run({
      during(event, { stop, clock }) {
        if (event.kind === 'sample' && event.sample.sequence === 2)
          clock.at(clock.monotonicMs() + 30, () => stop.abort());
      },
    });
    expect(outcome.state).toBe('interrupted');
    expect((outcome.error as DaemonError).code).toBe('RUN_INTERRUPTED');
    expect(await archive.samples(outcome.run.number)).toHaveLength(2);
    expect(diary.slice(-2)).toEqual(['positioner stop', 'analyzer source off']);
  });

  it('stops when a sample cannot be stored, before another sweep', async () => {
    const { outcome, diary } = await run({
      archive(archive) {
        const addSample = archive.addSample.bind(archive);
        archive.addSample = async (number, sample) => {
          if (sample.sequence === 2) throw new DaemonError('ARCHIVE_WRITE_FAILED', 'disk full');
          return addSample(number, sample);
        };
      },
    });
    expect(outcome.state).toBe('interrupted');
    expect(outcome.error).toMatchObject({ code: 'ARCHIVE_WRITE_FAILED' });
    expect(diary.filter((line) => line === 'analyzer acquire')).toHaveLength(2);
  });
});
