// Devices that do what a test tells them: an analyzer and a positioner that keep a diary and fail on order.
// For tests of the run loop alone; the simulated bench is the real partner.
import { Subject } from 'rxjs';
import type {
  Acquisition,
  Analyzer,
  AnalyzerIdentity,
  CalibrationState,
  PreparedSweep,
  SParameter,
  SweepSetup,
} from '../../drivers/analyzer/analyzer.ts';
import type { Clock } from '../../drivers/clock.ts';
import type {
  Arrival,
  AxisSetup,
  ControllerIdentity,
  Position,
  Positioner,
  PositionReport,
  StopReport,
} from '../../drivers/positioner/positioner.ts';

export type Diary = string[];
/** Called before each act; throws to make the act fail. */
export type Trouble = (act: string, count: number) => void;

const sweepMs = 50;

class Counter {
  readonly #counts = new Map<string, number>();
  readonly #trouble: Trouble;

  constructor(trouble: Trouble) {
    this.#trouble = trouble;
  }

  /** Counts the act and lets the test's trouble speak. */
  enter(act: string): void {
    const count = (this.#counts.get(act) ?? 0) + 1;
    this.#counts.set(act, count);
    this.#trouble(act, count);
  }
}

export class FakeAnalyzer implements Analyzer {
  readonly #clock: Clock;
  readonly #diary: Diary;
  readonly #counter: Counter;
  /** Level at the position the positioner last reached. */
  readonly #level: () => number;

  constructor(clock: Clock, diary: Diary, level: () => number, trouble: Trouble = () => {}) {
    this.#clock = clock;
    this.#diary = diary;
    this.#counter = new Counter(trouble);
    this.#level = level;
  }

  async identify(): Promise<AnalyzerIdentity> {
    this.#note('identify');
    return { maker: 'test', model: 'fake analyzer', serial: '1', firmware: '1' };
  }

  async prepare(setup: SweepSetup): Promise<PreparedSweep> {
    this.#note('prepare');
    const { startHz, stopHz, points, ...rest } = setup;
    const step = points > 1 ? (stopHz - startHz) / (points - 1) : 0;
    const frequenciesHz = Float64Array.from({ length: points }, (_, i) => startHz + i * step);
    return { ...rest, frequenciesHz, acquisitionMs: sweepMs };
  }

  async acquire(parameters: readonly SParameter[] = ['S21'], signal?: AbortSignal): Promise<Acquisition> {
    this.#note('acquire');
    const startMonotonicMs = this.#clock.monotonicMs();
    await this.#clock.sleep(sweepMs, signal);
    const level = this.#level();
    return {
      startMonotonicMs,
      stopMonotonicMs: this.#clock.monotonicMs(),
      timeLaw: { kind: 'linear', firstMs: 0, lastMs: sweepMs },
      traces: new Map(parameters.map((parameter) => [parameter, Float64Array.of(level, 0, level, 0)])),
    };
  }

  async source(on: boolean): Promise<void> {
    this.#note(on ? 'source on' : 'source off');
  }

  async calibrationState(): Promise<CalibrationState> {
    return { correctionOn: true };
  }

  async recover(): Promise<void> {
    this.#note('recover');
  }

  async close(): Promise<void> {
    this.#note('close');
  }

  #note(act: string): void {
    this.#diary.push(`analyzer ${act}`);
    this.#counter.enter(act);
  }
}

export class FakePositioner implements Positioner {
  readonly axes: readonly AxisSetup[];
  referenceValid = false;
  at: Position;
  readonly position$ = new Subject<PositionReport>();
  readonly #clock: Clock;
  readonly #diary: Diary;
  readonly #counter: Counter;

  constructor(clock: Clock, diary: Diary, axes: readonly AxisSetup[], trouble: Trouble = () => {}) {
    this.axes = axes;
    this.at = Object.fromEntries(axes.map((axis) => [axis.name, 0]));
    this.#clock = clock;
    this.#diary = diary;
    this.#counter = new Counter(trouble);
  }

  async identify(): Promise<ControllerIdentity> {
    this.#note('identify');
    this.referenceValid = false;
    return { family: 'realtime-status', firmware: 'fake', options: '' };
  }

  async home(): Promise<void> {
    this.#note('home');
    this.referenceValid = true;
  }

  async moveTo(
    target: Position,
    options: { throughApproach?: boolean; signal?: AbortSignal } = {},
  ): Promise<Arrival> {
    const angle = Object.values(target).join(' ');
    this.#diary.push(`positioner move ${angle}${options.throughApproach ? ' again' : ''}`);
    this.#counter.enter('move');
    await this.#clock.sleep(100, options.signal);
    this.at = { ...this.at, ...target };
    return { position: this.at, settledMonotonicMs: this.#clock.monotonicMs() };
  }

  async stop(): Promise<StopReport> {
    this.#note('stop');
    return { position: this.at, haltMs: 1 };
  }

  async readPosition(): Promise<Position> {
    return this.at;
  }

  async close(): Promise<void> {
    this.#note('close');
  }

  #note(act: string): void {
    this.#diary.push(`positioner ${act}`);
    this.#counter.enter(act);
  }
}

export function fakeAxis(homing: AxisSetup['homing'] = 'switch'): AxisSetup {
  return {
    name: 'azimuth',
    word: 'X',
    unitsPerDegree: 1,
    travelMinDeg: -200,
    travelMaxDeg: 200,
    rateDegPerS: 20,
    accelerationDegPerS2: 40,
    approachFrom: 'below',
    approachDeg: 2,
    settleMs: 100,
    toleranceDeg: 0.05,
    homing,
  };
}
