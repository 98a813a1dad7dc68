// A range in the process: the real drivers and run loop on in-memory links to the simulated bench, in
// virtual time, with an archive in memory. For nights and for checks of figures against the scene's truth.
import { InThreadArchive } from '../../daemon/archive/in-thread-archive.ts';
import { closeBench, makeBench } from '../../daemon/bench.ts';
import { parsePlan } from '../../daemon/files/parse-plan.ts';
import { parseRangeFile } from '../../daemon/files/parse-range-file.ts';
import type { RangeFile } from '../../daemon/files/range-file.ts';
import type { RunEvent } from '../../daemon/run/events.ts';
import { orderResume } from '../../daemon/run/order-resume.ts';
import { orderRun } from '../../daemon/run/order-run.ts';
import { RunLoop, type RunOrder, type RunOutcome } from '../../daemon/run/run-loop.ts';
import type { MemoryPort, MemoryPortOptions } from '../../drivers/link/memory.ts';
import type { Mechanics } from '../../mocks/positioner/mechanics.ts';
import { type BenchDescription, SimulatedBench } from '../../mocks/simulated-bench.ts';
import { SimulatedClock } from '../../mocks/simulated-clock.ts';

export interface RangeOptions {
  bench: BenchDescription;
  /** Home switches on both axes; else the controller's zero is believed. */
  homing?: 'switch' | 'none';
  trace?: string;
  /** What stands behind `dialect:` of the analyzer. */
  dialect?: string;
  /** Gear play of both axes in degrees. */
  gearPlayDeg?: number;
  wire?: MemoryPortOptions;
}

/** Sees every event; may stop the run. */
export type Watch = (event: RunEvent, stop: AbortController) => void;

export class SimulatedRange {
  readonly clock = new SimulatedClock();
  readonly bench: SimulatedBench;
  readonly archive: InThreadArchive;
  readonly #rangeText: string;
  readonly #ports: { analyzer: MemoryPort; positioner: MemoryPort };

  constructor(options: RangeOptions) {
    this.bench = new SimulatedBench(this.clock, {
      ...options.bench,
      positioner: {
        settings: controllerSettings(options.homing),
        mechanics: stageMechanics(options),
        ...options.bench.positioner,
      },
    });
    this.#ports = this.bench.listenInMemory(options.wire ?? {});
    let uuids = 0;
    this.archive = InThreadArchive.open(':memory:', {
      newUuid: () => `00000000-0000-4000-8000-${String(++uuids).padStart(12, '0')}`,
    });
    this.#rangeText = rangeText(options);
  }

  /** Executes one plan to its end, whatever that is; `watch` sees every event. */
  async measure(planText: string, watch: Watch = () => {}): Promise<RunOutcome> {
    const range = parseRangeFile(this.#rangeText, 'range.yaml');
    const draft = orderRun(range, parsePlan(planText, 'test.plan.yaml'));
    return this.#execute(range, await draft.complete(this.archive), watch);
  }

  /** Goes on with the newest interrupted run. */
  async resume(watch: Watch = () => {}): Promise<RunOutcome> {
    const range = parseRangeFile(this.#rangeText, 'range.yaml');
    return this.#execute(range, await orderResume(range, this.archive, undefined), watch);
  }

  #execute(range: RangeFile, order: RunOrder, watch: Watch): Promise<RunOutcome> {
    const devices = makeBench(range, this.clock, (_, device) => this.#ports[device].link());
    const loop = new RunLoop(devices, this.archive, this.clock, order);
    const stop = new AbortController();
    loop.events$.subscribe((event) => watch(event, stop));
    return this.clock.run(loop.execute(stop.signal).finally(() => closeBench(devices)));
  }

  async close(): Promise<void> {
    await this.clock.run(this.bench.close());
    await this.archive.close();
  }
}

/** 20°/s and 40°/s² on every axis, ±200°; homing as the range file says. */
function controllerSettings(homing: RangeOptions['homing']): Record<number, number> {
  const perAxis = [0, 1, 2].flatMap((axis): [number, number][] => [
    [110 + axis, 1200],
    [120 + axis, 40],
    [130 + axis, 400],
  ]);
  return { ...Object.fromEntries(perAxis), 22: homing === 'switch' ? 1 : 0 };
}

/** Where boresight is in the controller's count: homed to switches at +200°, it counts down from zero. */
export const homedBoresightDeg = -200;

function stageMechanics({ homing, gearPlayDeg = 0 }: RangeOptions): Mechanics {
  const axis = { playUnits: gearPlayDeg, ...(homing === 'switch' ? { switchUnits: 200 } : {}) };
  return { X: axis, Y: axis };
}

function rangeText(options: RangeOptions): string {
  const homed = options.homing === 'switch';
  const axis = (word: string): string => `
      word: ${word}
      unitsPerDegree: 1
      travel: ${homed ? '{ min: -398 deg, max: -2 deg }' : '{ min: -200 deg, max: 200 deg }'}
      rate: 20 deg/s
      acceleration: 40 deg/s2
      approach: { from: below, by: 2 deg }
      settle: 200 ms
      tolerance: 0.05 deg
      homing: ${options.homing ?? 'none'}
      sense: +1
      boresight: ${homed ? homedBoresightDeg : 0} deg`;
  return `
range: test meadow
rangeLength: 6 m
analyzer:
  link: tcp://127.0.0.1:1
  dialect: ${options.dialect ?? 'numbered-parameter'}
  autPort: 1
  trace: ${options.trace ?? '{ format: real64, byteOrder: normal }'}
positioner:
  link: tcp://127.0.0.1:2
  family: ${options.bench.positioner?.family ?? 'realtime-status'}
  axes:
    azimuth:${axis('X')}
    elevation:${axis('Y')}
antennas:
  rangeAntenna: range antenna
  reference:
    name: half-wave dipole
    gain:
      stated: ieee
      table:
        - { at: 820 MHz, gain: 2.0994 dBi }
        - { at: 868 MHz, gain: 2.144 dBi }
        - { at: 920 MHz, gain: 2.198 dBi }
archive: unused.sqlite
`;
}

export const referencePlan = `
antenna: { name: half-wave dipole, revision: A }
kind: reference
band: { from: 820 MHz, to: 920 MHz, points: 201 }
markers: [868 MHz]
analyzer: { ifBandwidth: 1 kHz, power: 0 dBm, averages: 1 }
`;

/** A full turn of one or both axes; `points` over 820–920 MHz. */
export function patternPlan(
  cuts: readonly ('azimuth' | 'elevation')[],
  options: { gainReference?: string; points?: number; stepDeg?: number } = {},
): string {
  const { gainReference = 'latest', points = 201, stepDeg = 1 } = options;
  return `
antenna: { name: river-gauge yagi, revision: C }
kind: pattern
band: { from: 820 MHz, to: 920 MHz, points: ${points} }
markers: [868 MHz]
analyzer: { ifBandwidth: 1 kHz, power: 0 dBm, averages: 1 }
gainReference: ${gainReference}
cuts:
${cuts
  .map(
    (name) =>
      `  - { name: ${name}, axis: ${name}, plane: ${name === 'azimuth' ? 'H' : 'E'}, from: -180 deg, to: 180 deg, step: ${stepDeg} deg }`,
  )
  .join('\n')}
ties: { every: 60 }
checks: { closure: 0.2 dB, drift: 0.5 dB }
`;
}
