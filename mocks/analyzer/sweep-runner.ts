// Sweeps that take their time: what runs now, when it ends, and the data of the last one that is complete.
//
//   pass on port 1: |p0|p1|p2| … |pN−1|  pass on port 2, when wanted: |p0| …    each point takes pointMs(),
//   measured at its middle. Averaging by sweeps repeats all passes; by points it lengthens each point.
//
// Continuous sweeps set no timers: which one was complete last follows from the clock when data are read.
import type { Cancel, Clock } from '../../drivers/clock.ts';
import type { InstrumentFaults } from './faults.ts';
import type { Measure, SParameterName, SweepPass } from './measurement.ts';
import { frequencyGrid, type Settings } from './settings.ts';

export interface SweepTiming {
  /** Per point: this over the IF bandwidth … */
  filterFactor: number;
  /** … and this besides. */
  settleMs: number;
}

type Traces = Map<SParameterName, Float64Array>;

interface Plan {
  settings: Settings;
  grid: Float64Array;
  passes: { drivenPort: 1 | 2; parameters: SParameterName[] }[];
  repeats: number;
  averagesPerPoint: number;
  pointMs: number;
  /** One pass on every driven port. */
  sweepMs: number;
  totalMs: number;
}

type State =
  | { kind: 'idle' }
  | { kind: 'armed' }
  | { kind: 'sweeping'; startMs: number; endMs: number; cancel: Cancel }
  | { kind: 'continuous'; startMs: number; readIndex: number };

export class SweepRunner {
  readonly #clock: Clock;
  readonly #measure: Measure;
  readonly #timing: SweepTiming;
  readonly #faults: () => InstrumentFaults;
  #settings: Settings;
  #plan: Plan;
  #state: State = { kind: 'idle' };
  #data: Traces | undefined;
  #waiting: (() => void)[] = [];

  constructor(
    clock: Clock,
    measure: Measure,
    timing: SweepTiming,
    faults: () => InstrumentFaults,
    settings: Settings,
  ) {
    this.#clock = clock;
    this.#measure = measure;
    this.#timing = timing;
    this.#faults = faults;
    this.#settings = settings;
    this.#plan = this.#planOf(settings, frequencyGrid(settings));
    this.#followMode();
  }

  get frequenciesHz(): Float64Array {
    return this.#plan.grid;
  }

  /** One sweep over all driven ports, without averaging. */
  get sweepMs(): number {
    return this.#plan.sweepMs;
  }

  get isSweeping(): boolean {
    return this.#state.kind === 'sweeping' || this.#state.kind === 'continuous';
  }

  get isArmed(): boolean {
    return this.#state.kind === 'armed';
  }

  /** New settings. What touches the stimulus makes the data old and starts a running sweep afresh. */
  use(settings: Settings): void {
    const before = this.#settings;
    this.#settings = settings;
    const sameGrid = gridKeys.every((key) => before[key] === settings[key]);
    const sameStimulus = sameGrid && stimulusKeys.every((key) => before[key] === settings[key]);
    const grid = sameGrid ? this.#plan.grid : frequencyGrid(settings);
    this.#plan = this.#planOf(settings, grid);
    if (!sameStimulus) this.#data = undefined;
    if (before.continuous !== settings.continuous) this.#followMode();
    else if (this.#state.kind === 'sweeping' && !sameStimulus) this.#begin();
    else if (this.#state.kind === 'continuous')
      this.#restartContinuous(sameStimulus, before.traces !== settings.traces);
  }

  /** A single sweep: begins now, or waits for its trigger. False when one is under way already. */
  initiate(): boolean {
    if (this.#state.kind !== 'idle') return false;
    const { triggerSource } = this.#settings;
    if (triggerSource === 'IMM' || triggerSource === 'INT') this.#begin();
    else this.#state = { kind: 'armed' };
    return true;
  }

  /** False when nothing waits for a trigger. */
  trigger(): boolean {
    if (this.#state.kind !== 'armed') return false;
    this.#begin();
    return true;
  }

  /** Ends what runs without data; a continuous sweep begins anew. */
  abort(): void {
    if (this.#state.kind === 'sweeping') this.#state.cancel();
    this.#state = { kind: 'idle' };
    this.#releaseWaiting();
    this.#followMode();
  }

  /** Ends what runs and forgets all data, as a reset does. */
  reset(): void {
    this.#data = undefined;
    this.abort();
  }

  /** Resolves when no single sweep is under way; at once in continuous mode. */
  whenDone(): Promise<void> {
    if (this.#state.kind !== 'sweeping' && this.#state.kind !== 'armed') return Promise.resolve();
    return new Promise((resolve) => this.#waiting.push(resolve));
  }

  /** The last complete sweep of a parameter; undefined when there is none since the last change. */
  read(parameter: SParameterName): Float64Array | undefined {
    const state = this.#state;
    if (state.kind === 'continuous') {
      const index = Math.floor((this.#clock.monotonicMs() - state.startMs) / this.#plan.totalMs) - 1;
      if (index >= 0 && index !== state.readIndex) {
        state.readIndex = index;
        this.#data = this.#collect(this.#plan, state.startMs + index * this.#plan.totalMs);
      }
    }
    return this.#data?.get(parameter);
  }

  #followMode(): void {
    if (this.#settings.continuous) {
      if (this.#state.kind === 'sweeping') this.#state.cancel();
      this.#state = { kind: 'continuous', startMs: this.#clock.monotonicMs(), readIndex: -1 };
      this.#releaseWaiting();
    } else if (this.#state.kind === 'continuous') {
      this.#state = { kind: 'idle' };
    }
  }

  #restartContinuous(sameStimulus: boolean, tracesChanged: boolean): void {
    if (sameStimulus && !tracesChanged) return;
    this.#state = { kind: 'continuous', startMs: this.#clock.monotonicMs(), readIndex: -1 };
  }

  #begin(): void {
    if (this.#state.kind === 'sweeping') this.#state.cancel();
    const startMs = this.#clock.monotonicMs();
    const plan = this.#plan;
    const endMs = startMs + plan.totalMs + (this.#faults().stretchSweepMs?.() ?? 0);
    const cancel = Number.isFinite(endMs)
      ? this.#clock.at(endMs, () => this.#finish(plan, startMs))
      : () => {};
    this.#state = { kind: 'sweeping', startMs, endMs, cancel };
  }

  #finish(plan: Plan, startMs: number): void {
    this.#data = this.#collect(plan, startMs);
    this.#state = { kind: 'idle' };
    this.#releaseWaiting();
  }

  #releaseWaiting(): void {
    const waiting = this.#waiting;
    this.#waiting = [];
    for (const resolve of waiting) resolve();
  }

  #collect(plan: Plan, startMs: number): Traces {
    const traces: Traces = new Map();
    for (let repeat = 0; repeat < plan.repeats; repeat++) {
      plan.passes.forEach((pass, p) => {
        const firstMs = startMs + repeat * plan.sweepMs + p * plan.pointMs * plan.grid.length;
        addInto(traces, this.#measure(this.#passOf(plan, pass, firstMs)), 1 / plan.repeats);
      });
    }
    this.#faults().onTraces?.(traces);
    return traces;
  }

  #passOf(plan: Plan, { drivenPort, parameters }: Plan['passes'][number], firstMs: number): SweepPass {
    const { settings } = plan;
    return {
      parameters,
      drivenPort,
      frequenciesHz: plan.grid,
      pointMs: (index) => firstMs + (index + 0.5) * plan.pointMs,
      ifBandwidthHz: settings.ifBandwidthHz,
      averages: plan.averagesPerPoint,
      powerDbm: settings.powerDbm,
      sourceOn: settings.outputOn,
      corrected: settings.correctionOn,
    };
  }

  #planOf(settings: Settings, grid: Float64Array): Plan {
    const shown = settings.traces.filter((trace) => trace.shown);
    const wanted = [...new Set(shown.map((trace) => trace.parameter))].toSorted();
    const passes = ([1, 2] as const)
      .map((drivenPort) => ({
        drivenPort,
        parameters: wanted.filter((name) => name[2] === String(drivenPort)),
      }))
      .filter((pass) => pass.parameters.length > 0);
    const averages = settings.averagingOn ? settings.averages : 1;
    const byPoint = settings.averagingMode === 'POIN';
    const filterMs = (1000 * this.#timing.filterFactor) / settings.ifBandwidthHz;
    const pointMs = (byPoint ? averages : 1) * (filterMs + this.#timing.settleMs) + 1000 * settings.dwellS;
    const sweepMs = pointMs * grid.length * passes.length;
    const repeats = byPoint ? 1 : averages;
    return {
      settings,
      grid,
      passes,
      repeats,
      averagesPerPoint: byPoint ? averages : 1,
      pointMs,
      sweepMs,
      totalMs: sweepMs * repeats,
    };
  }
}

const gridKeys = ['startHz', 'stopHz', 'cwHz', 'points', 'sweepType'] as const;

const stimulusKeys = [
  'ifBandwidthHz',
  'dwellS',
  'powerDbm',
  'averagingOn',
  'averages',
  'averagingMode',
  'correctionOn',
] as const;

function addInto(sum: Traces, part: Traces, weight: number): void {
  for (const [name, values] of part) {
    const known = sum.get(name);
    if (known) for (let i = 0; i < values.length; i++) known[i]! += weight * values[i]!;
    else
      sum.set(
        name,
        values.map((value) => weight * value),
      );
  }
}
