// What Analyzer promises, kept by the real driver against the simulated instrument on every wire: the traces
// are those of the scene, a setting that differs is refused, and whatever strikes ends in a typed error or in
// recovery, never in a wrong trace and never in silence.
import { afterEach, describe, expect, it } from 'vitest';
import type { Acquisition, Analyzer, SParameter, SweepSetup } from '../../drivers/analyzer/analyzer.ts';
import { dialectNamed } from '../../drivers/analyzer/scpi-dialects.ts';
import { DriverError } from '../../drivers/errors.ts';
import { faults } from '../../mocks/faults/fault-table.ts';
import type { SceneDescription } from '../../mocks/scene/scene-description.ts';
import { analyzerOn, type ReachableBench, type Wire, wires } from '../support/bench-wires.ts';

const setup: SweepSetup = {
  startHz: 820e6,
  stopHz: 920e6,
  points: 11,
  ifBandwidthHz: 1000,
  powerDbm: 0,
  averages: 1,
  parameters: ['S11', 'S21', 'S12', 'S22'],
};

/** The mast stands a third of a half-power beamwidth aside, so that no symmetry hides a mistake. */
const stage = { mechanics: { X: { startUnits: 22 }, Y: { startUnits: -9 } } };
/** A range antenna that reflects a little, so that S22 is something to be read. */
const antennas: SceneDescription['antennas'] = {
  range: { kind: 'cardioid', gainDbi: 8, frontToBackDb: 20, reflection: { magnitude: 0.2, phaseDeg: 50 } },
};
const silent: SceneDescription = {
  antennas,
  noise: { snrDb: Number.POSITIVE_INFINITY, reflectionSnrDb: Number.POSITIVE_INFINITY },
};
/** Below what the comparison sees, but no two sweeps are alike bit for bit. */
const quiet: SceneDescription = { antennas, noise: { snrDb: 130, reflectionSnrDb: 130 } };
const quietTolerance = 1e-5;

const open: ReachableBench[] = [];
const devices: Analyzer[] = [];

afterEach(async () => {
  for (const at of open) await at.run(Promise.all(devices.splice(0).map((device) => device.close())));
  for (const at of open.splice(0)) await at.close();
});

/** Every wire with the first dialect, and every other dialect on one wire of each kind. */
const dialects = ['numbered-parameter', 'named-measurement', 'selected-trace'] as const;
interface Meeting extends Wire {
  dialect: (typeof dialects)[number];
}
const meetings: readonly Meeting[] = dialects.flatMap((dialect, i) =>
  wires
    .filter(({ name }) => i === 0 || name === 'memory' || name === 'sockets')
    .map((wire) => ({ ...wire, name: i === 0 ? wire.name : `${wire.name}, ${dialect}`, dialect })),
);

interface Rig {
  at: ReachableBench;
  analyzer: Analyzer;
}

async function rigOn(
  wire: Meeting,
  scene: SceneDescription,
  options: Parameters<typeof analyzerOn>[1] = {},
): Promise<Rig> {
  const at = await wire.reach({ scene, positioner: stage, analyzer: { commandTree: wire.dialect } });
  const analyzer = analyzerOn(at, { dialect: dialectNamed(wire.dialect), ...options });
  open.push(at);
  devices.push(analyzer);
  return { at, analyzer };
}

async function preparedOn(
  wire: Meeting,
  scene: SceneDescription,
  own: Partial<SweepSetup> = {},
): Promise<Rig> {
  const rig = await rigOn(wire, scene);
  await rig.at.run(rig.analyzer.identify());
  await rig.at.run(rig.analyzer.prepare({ ...setup, ...own }));
  return rig;
}

async function failureOf(at: ReachableBench, work: Promise<unknown>): Promise<DriverError> {
  const outcome = await at.run(
    work.then(
      () => 'it did not fail',
      (error: unknown) => error,
    ),
  );
  if (outcome instanceof DriverError) return outcome;
  throw outcome instanceof Error ? outcome : new Error(String(outcome));
}

/** The scene's own value at point `k` of the setup, part by part. */
function truth({ bench, nowMs }: ReachableBench, parameter: SParameter, k: number, points: number): number[] {
  const frequencyHz = setup.startHz + ((setup.stopHz - setup.startHz) * k) / (points - 1);
  const { re, im } = bench.scene.s(parameter, frequencyHz, nowMs(), bench.controller.poseAt(nowMs()));
  return [re, im];
}

/** Points of a trace that are off by more than `relative` of the strongest value of the scene. */
function pointsOff(
  at: ReachableBench,
  acquired: Acquisition,
  parameter: SParameter,
  relative: number,
): number {
  const trace = acquired.traces.get(parameter);
  const points = (trace?.length ?? 0) / 2;
  expect(points).toBe(setup.points);
  const wanted = Array.from({ length: points }, (_, k) => truth(at, parameter, k, points));
  const strongest = Math.max(...wanted.map(([re = 0, im = 0]) => Math.hypot(re, im)));
  return wanted.filter(([re = 0, im = 0], k) => {
    const off = Math.hypot((trace?.[2 * k] ?? Number.NaN) - re, (trace?.[2 * k + 1] ?? Number.NaN) - im);
    return !(off <= relative * strongest);
  }).length;
}

function expectScene(at: ReachableBench, acquired: Acquisition, relative = quietTolerance): void {
  for (const parameter of setup.parameters) {
    expect(pointsOff(at, acquired, parameter, relative), `${parameter}: points off`).toBe(0);
  }
}

/** Counts the sweeps whose data came into being, beside whatever else the bench does to them. */
function countSweeps({ bench }: ReachableBench): () => number {
  const before = bench.instrument.faults;
  let sweeps = 0;
  bench.instrument.faults = {
    ...before,
    onTraces: (traces) => {
      sweeps += 1;
      before.onTraces?.(traces);
    },
  };
  return () => sweeps;
}

/** Half a unit of the last place: 53 and 24 bits of mantissa (IEEE 754); 12 decimal digits as text. */
const formats = [
  // The scene reckons a single point and a grid in another order of operations: a few roundings.
  { traceFormat: 'real64', relative: 1e-13 },
  { traceFormat: 'real32', relative: 2 ** -24 },
  { traceFormat: 'ascii', relative: 0.5e-11 },
] as const;

describe.each(meetings)('an analyzer over $name', (wire) => {
  it('says who it is', async () => {
    const { at, analyzer } = await rigOn(wire, silent);
    expect(await at.run(analyzer.identify())).toEqual({
      maker: 'NIGHTCUT',
      model: 'BENCH-2PORT',
      serial: 'SIM-0001',
      firmware: '1.0',
    });
  });

  for (const { traceFormat, relative } of formats) {
    for (const byteOrder of ['normal', 'swapped'] as const) {
      it(`reads the scene in ${traceFormat}, byte order ${byteOrder}`, async () => {
        const { at, analyzer } = await rigOn(wire, silent, { traceFormat, byteOrder });
        await at.run(analyzer.identify());
        const { frequenciesHz } = await at.run(analyzer.prepare(setup));
        expect(Array.from(frequenciesHz, (hz) => Math.round(hz))).toEqual(
          [0, 1, 2, 3, 4, 5, 6, 7, 8, 9, 10].map((k) => 820e6 + 10e6 * k),
        );
        const acquired = await at.run(analyzer.acquire());
        expect([...acquired.traces.keys()].toSorted()).toEqual(['S11', 'S12', 'S21', 'S22']);
        for (const [parameter, trace] of acquired.traces) {
          for (let k = 0; k < setup.points; k += 1) {
            for (const [part, wanted] of truth(at, parameter, k, setup.points).entries()) {
              const off = Math.abs((trace[2 * k + part] ?? Number.NaN) - wanted);
              expect(off, `${parameter} point ${k + 1}`).toBeLessThanOrEqual(
                relative * Math.abs(wanted) + 1e-15,
              );
            }
          }
        }
      });
    }
  }

  it('reads a subset of what is prepared', async () => {
    const { at, analyzer } = await preparedOn(wire, quiet);
    const acquired = await at.run(analyzer.acquire(['S21']));
    expect([...acquired.traces.keys()]).toEqual(['S21']);
    expect(pointsOff(at, acquired, 'S21', quietTolerance)).toBe(0);
  });

  it('averages as many sweeps as asked, which takes as much longer', async () => {
    const averages = 64;
    const points = 201;
    const scatter: number[] = [];
    const statedMs: number[] = [];
    const { at, analyzer } = await rigOn(wire, { noise: { snrDb: 30 } });
    await at.run(analyzer.identify());
    for (const each of [1, averages]) {
      const sweep = { ...setup, points, parameters: ['S21'] as const, averages: each };
      const prepared = await at.run(analyzer.prepare(sweep));
      const begunMs = at.nowMs();
      const { traces } = await at.run(analyzer.acquire());
      expect(at.nowMs() - begunMs).toBeGreaterThanOrEqual(prepared.acquisitionMs);
      statedMs.push(prepared.acquisitionMs);
      const trace = traces.get('S21') ?? new Float64Array(0);
      let sum = 0;
      for (let k = 0; k < points; k += 1) {
        const [re = 0, im = 0] = truth(at, 'S21', k, points);
        sum += (trace[2 * k]! - re) ** 2 + (trace[2 * k + 1]! - im) ** 2;
      }
      scatter.push(Math.sqrt(sum / points));
    }
    // Noise falls with the square root of the number. A rms of 201 complex readings is known to 5 %, the
    // ratio of two to 7 %; four of these are allowed.
    expect(scatter[0]! / scatter[1]!).toBeGreaterThan(8 * 0.72);
    expect(scatter[0]! / scatter[1]!).toBeLessThan(8 * 1.28);
    expect(statedMs[1]! / statedMs[0]!).toBeCloseTo(averages, 1);
  });

  it('refuses to measure when the analyzer accepted another value', async () => {
    const { at, analyzer } = await rigOn(wire, silent);
    const sweeps = countSweeps(at);
    await at.run(analyzer.identify());
    // Filters exist at 1, 1.5, 2, 3, 5 and 7 in each decade: the next one above 1.234 kHz is 1.5 kHz.
    const refusal = await failureOf(at, analyzer.prepare({ ...setup, ifBandwidthHz: 1234 }));
    expect(refusal).toMatchObject({ code: 'ANALYZER_SETTING_DIFFERS', facts: { asked: 1234, got: 1500 } });
    const again = await failureOf(at, analyzer.acquire());
    expect(again).toMatchObject({ code: 'ANALYZER_SETTING_DIFFERS', facts: { asked: 1234, got: 1500 } });
    expect(sweeps()).toBe(0);
    await at.run(analyzer.prepare(setup));
    await at.run(analyzer.acquire());
    expect(sweeps()).toBe(1);
  });

  it('refuses what the instrument cannot do at all', async () => {
    const { at, analyzer } = await rigOn(wire, silent);
    await at.run(analyzer.identify());
    const refusal = await failureOf(at, analyzer.prepare({ ...setup, powerDbm: 90 }));
    expect(['ANALYZER_COMMAND_REFUSED', 'ANALYZER_SETTING_DIFFERS']).toContain(refusal.code);
  });

  it('switches the source off while a sweep hangs', async () => {
    const { at, analyzer } = await preparedOn(wire, quiet);
    await at.run(analyzer.source(true));
    expect(at.bench.instrument.settings.outputOn).toBe(true);
    at.bench.instrument.faults = {
      ...at.bench.instrument.faults,
      stretchSweepMs: () => Number.POSITIVE_INFINITY,
    };
    const hanging = analyzer.acquire();
    // Its failure is looked at below; until then it must not count as unhandled.
    hanging.catch(() => {});
    await at.pass(wire.kind === 'memory' ? 150 : 6000);
    expect(at.bench.instrument.isSweeping).toBe(true);
    const calledMs = at.clock.monotonicMs();
    const off = analyzer.source(false);
    while (at.bench.instrument.settings.outputOn && at.clock.monotonicMs() < calledMs + 2000) {
      await at.pass(10);
    }
    // The promise of the stop path: its bytes leave within 100 ms; sockets of this process add their own.
    expect(at.clock.monotonicMs() - calledMs).toBeLessThanOrEqual(wire.kind === 'memory' ? 100 : 1000);
    expect(at.bench.instrument.settings.outputOn).toBe(false);
    await at.run(off);
    expect((await failureOf(at, hanging)).code).toBe('ANALYZER_INTERRUPTED');
    expect(at.bench.instrument.isSweeping).toBe(false);
  });

  it('switches the source off while a question hangs', async () => {
    const { at, analyzer } = await preparedOn(wire, quiet);
    await at.run(analyzer.source(true));
    const hooks = at.bench.instrument.faults;
    let isSwallowed = false;
    at.bench.instrument.faults = {
      ...hooks,
      onAnswer: (answer, message) => {
        if (isSwallowed || !message.includes('*ESR?')) return answer;
        isSwallowed = true;
        return undefined;
      },
    };
    const hanging = analyzer.acquire();
    hanging.catch(() => {});
    while (!isSwallowed) await at.pass(10);
    await at.pass(10);
    const calledMs = at.clock.monotonicMs();
    const off = analyzer.source(false);
    while (at.bench.instrument.settings.outputOn && at.clock.monotonicMs() < calledMs + 2000) {
      await at.pass(1);
    }
    // Past the question: the way of the bytes and nothing else, on the wire in memory.
    expect(at.clock.monotonicMs() - calledMs).toBeLessThanOrEqual(wire.kind === 'memory' ? 10 : 1000);
    expect(at.bench.instrument.settings.outputOn).toBe(false);
    await at.run(off);
    expect((await failureOf(at, hanging)).code).toBe('ANALYZER_INTERRUPTED');
  });

  it('gives up an acquisition when its caller does, and leaves no sweep running', async () => {
    const { at, analyzer } = await preparedOn(wire, quiet);
    const hooks = at.bench.instrument.faults;
    at.bench.instrument.faults = { ...hooks, stretchSweepMs: () => Number.POSITIVE_INFINITY };
    const patience = new AbortController();
    const given = analyzer.acquire(['S21'], patience.signal).catch((error: unknown) => error);
    await at.pass(wire.kind === 'memory' ? 150 : 6000);
    const reason = new Error('the caller has had enough');
    patience.abort(reason);
    expect(await at.run(given)).toBe(reason);
    at.bench.instrument.faults = hooks;
    await at.pass(wire.kind === 'memory' ? 50 : 3000);
    expect(at.bench.instrument.isSweeping).toBe(false);
    expectScene(at, await at.run(analyzer.acquire()));
  });

  it('gives up a sweep that never ends, and sweeps again', async () => {
    const { at, analyzer } = await preparedOn(wire, quiet);
    const hooks = at.bench.instrument.faults;
    at.bench.instrument.faults = { ...hooks, stretchSweepMs: () => Number.POSITIVE_INFINITY };
    expect((await failureOf(at, analyzer.acquire())).code).toBe('ANALYZER_SWEEP_TIMEOUT');
    at.bench.instrument.faults = hooks;
    expectScene(at, await at.run(analyzer.acquire()));
  });

  it('tells of a power cycle once, and has everything prepared again', async () => {
    const { at, analyzer } = await preparedOn(wire, quiet);
    expectScene(at, await at.run(analyzer.acquire()));
    at.bench.faults.inject('power-cycle');
    const told = [(await failureOf(at, analyzer.acquire())).code];
    for (let tries = 0; tries < 20 && !told.includes('ANALYZER_POWER_CYCLED'); tries += 1) {
      await at.pass(1000);
      told.push((await failureOf(at, analyzer.recover())).code);
    }
    expect(told.filter((code) => code === 'ANALYZER_POWER_CYCLED')).toHaveLength(1);
    expectScene(at, await at.run(analyzer.acquire()));
  });

  it('cannot confirm that the source is off when the instrument hears nothing, and says so', async () => {
    const { at, analyzer } = await preparedOn(wire, quiet);
    // Deaf for as long as it takes, on either clock.
    at.bench.instrument.faults = { ...at.bench.instrument.faults, onMessage: () => 'lose' };
    expect((await failureOf(at, analyzer.source(false))).code).toMatch(/^(ANALYZER|LINK)_/);
    expect(at.bench.instrument.settings.outputOn).toBe(true);
  });
});

const strikes = faults.filter((fault) => fault.target === 'analyzer').map((fault) => fault.name);
/** What is on the mast changes before every sweep: an old trace cannot pass for a new one. */
const mounts = ['reference', 'aut'] as const;

/**
 * Identifies, prepares and sweeps twice, as patient as a run is; returns the codes of what failed. After a
 * failure the session is in step again, as promised: where `recovers` is false the same is simply asked once
 * more before anything is opened anew.
 */
async function wholeSession(
  { at, analyzer }: Rig,
  check: (acquired: Acquisition) => void,
  recovers = true,
): Promise<string[]> {
  const failed: string[] = [];
  const insist = async <T>(act: () => Promise<T>): Promise<T> => {
    for (let tried = 0; ; tried += 1) {
      try {
        return await at.run(act());
      } catch (error) {
        if (!(error instanceof DriverError) || tried === 30) throw error;
        failed.push(error.code);
        if (!recovers && tried === 0) continue;
        await at.pass(2000);
        await at.run(analyzer.recover()).catch((again: unknown) => {
          if (!(again instanceof DriverError)) throw again;
          failed.push(again.code);
        });
      }
    }
  };
  await insist(() => analyzer.identify());
  await insist(() => analyzer.prepare(setup));
  for (const mounted of mounts) {
    at.bench.mount(mounted);
    check(await insist(() => analyzer.acquire()));
  }
  return failed;
}

/** The traces are the scene's; a neighbour's signal is in the air, and is measured as it is. */
function expectTrue(at: ReachableBench, acquired: Acquisition, name: string, when: string): void {
  const burst = name === 'noise-burst' ? Math.round(setup.points / 10) : 0;
  for (const parameter of setup.parameters) {
    const off = pointsOff(at, acquired, parameter, quietTolerance);
    expect(off, `${name} ${when}: points of ${parameter} off`).toBeLessThanOrEqual(burst);
  }
}

/** How many answers a session has when nothing strikes, counted on the wire in memory. */
async function answersOfASession(dialect: Meeting['dialect']): Promise<number> {
  const rig = await rigOn(meetings.find((meeting) => meeting.dialect === dialect)!, quiet);
  const before = rig.at.bench.instrument.faults;
  let answers = 0;
  rig.at.bench.instrument.faults = {
    ...before,
    onAnswer: (answer) => {
      answers += 1;
      return answer;
    },
  };
  expect(await wholeSession(rig, () => {})).toEqual([]);
  return answers;
}

/** Sessions that are struck once, each later than the one before; returns the codes of what failed. */
async function struckSessions(
  wire: Meeting,
  name: string,
  stride: number,
  recovers = true,
): Promise<string[]> {
  const sockets = wire.kind === 'sockets';
  // A bench that runs ahead is polled less often; and every silence there is waited for in the world's time.
  const answers = Math.floor((await answersOfASession(wire.dialect)) * (sockets ? 0.75 : 1));
  const options = sockets ? { answerTimeoutMs: 1000 } : {};
  const failed: string[] = [];
  for (let after = 1; after <= answers; after += stride) {
    const rig = await rigOn(wire, { ...quiet, seed: after }, options);
    rig.at.bench.faults.injectAfter(name, after);
    const check = (acquired: Acquisition): void =>
      expectTrue(rig.at, acquired, name, `after ${after} answers`);
    const codes = await wholeSession(rig, check, recovers);
    expect(rig.at.bench.faults.journal, `${name} struck after ${after} answers`).toHaveLength(1);
    // These strike a single answer or sweep, so that one more try is all it takes.
    const isBrief = ['garbage-answer', 'truncated-block', 'late-answer', 'nan-block'].includes(name);
    if (isBrief && !recovers) {
      expect(codes.length, `${name} after ${after} answers: ${codes.join(', ')}`).toBeLessThanOrEqual(1);
    }
    failed.push(...codes);
  }
  return failed;
}

describe.each(meetings.filter((wire) => wire.kind === 'memory'))(
  'faults of the instrument over $name',
  (wire) => {
    it.each(strikes)('%s: an error with a code or recovery, never a wrong trace', async (name) => {
      const failed = await struckSessions(wire, name, wire.name === 'memory' ? 1 : 5);
      if (name === 'noise-burst') expect(failed).toEqual([]);
      else expect(failed.length).toBeGreaterThan(0);
    });

    it.each(strikes)('%s: the next try needs no recovery', async (name) => {
      await struckSessions(wire, name, wire.name === 'memory' ? 1 : 7, false);
    });
  },
);

it('faults of the instrument over sockets: each on a bench of its own', async () => {
  const sockets = meetings.find((wire) => wire.kind === 'sockets')!;
  const failed = await Promise.all(strikes.map((name) => struckSessions(sockets, name, 17)));
  for (const [index, name] of strikes.entries()) {
    // Of a bench that runs ahead no answer is too late.
    const isFelt = name !== 'noise-burst' && name !== 'late-answer';
    expect(failed[index]!.length > 0, name).toBe(isFelt);
  }
});

describe('faults of the instrument at moments of a session', () => {
  for (const name of strikes) {
    it(`${name}: strikes at any time, never a wrong trace`, async () => {
      for (let afterMs = 0.5; afterMs < 60; afterMs += 2.5) {
        const rig = await rigOn(meetings[0]!, { ...quiet, seed: afterMs });
        const { at, analyzer } = rig;
        await at.run(analyzer.identify());
        await at.run(analyzer.prepare(setup));
        at.later(afterMs, () => void at.bench.faults.inject(name));
        await wholeSession(rig, (acquired) => expectTrue(at, acquired, name, `after ${afterMs} ms`));
        expect(at.bench.faults.journal).toHaveLength(1);
      }
    });
  }
});
