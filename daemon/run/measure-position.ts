// One angle: move there from the approach side, wait until the sample before is durable, sweep, and put
// the sample together. Stores nothing and retries nothing; a failure says which device it came from.
import type { Acquisition, Analyzer, SParameter } from '../../drivers/analyzer/analyzer.ts';
import type { Clock } from '../../drivers/clock.ts';
import type { Arrival, Positioner } from '../../drivers/positioner/positioner.ts';
import type { SampleRecord } from '../archive/archive.ts';
import type { PlannedStep } from '../plan/expand.ts';
import type { Device } from './events.ts';

/** A failure at one position, with the device that failed. */
export class StepFailure extends Error {
  override readonly name = 'StepFailure';
  readonly device: Device;

  constructor(device: Device, cause: unknown) {
    super(cause instanceof Error ? cause.message : String(cause), { cause });
    this.device = device;
  }
}

export async function from<T>(device: Device, work: Promise<T>): Promise<T> {
  try {
    return await work;
  } catch (error) {
    throw new StepFailure(device, error);
  }
}

export interface PositionTools {
  analyzer: Analyzer;
  positioner: Positioner;
  clock: Clock;
  /** S-parameters for the transmission and for the match of the AUT. */
  transmission: SParameter;
  match: SParameter;
  /** Resolves when everything acquired before is durable; rejects when it could not be stored. */
  beforeDurable: () => Promise<void>;
}

/** Where the sample belongs: counters the run keeps. */
export interface SampleContext {
  segment: number;
  sequence: number;
  setup: number;
  attempt: number;
  /** Leave the target and come back from the approach side, although the axes may stand there. */
  revisit: boolean;
}

/** Throws StepFailure, or the archive's error when the sample before could not be stored. */
export async function measurePosition(
  tools: PositionTools,
  step: PlannedStep,
  context: SampleContext,
  signal: AbortSignal,
): Promise<SampleRecord> {
  const arrival = await from(
    'positioner',
    tools.positioner.moveTo(step.target, { throughApproach: context.revisit, signal }),
  );
  await tools.beforeDurable();
  signal.throwIfAborted();
  const acquisition = await from('analyzer', tools.analyzer.acquire(parametersOf(step, tools), signal));
  return toSample(step, context, arrival, acquisition);
}

/** Ties and the reference also carry the match of the AUT; within a cut it only costs time. */
function parametersOf(step: PlannedStep, tools: PositionTools): SParameter[] {
  const withMatch = step.purpose === 'tie' || step.purpose === 'reference';
  return withMatch ? [tools.transmission, tools.match] : [tools.transmission];
}

function toSample(
  step: PlannedStep,
  context: SampleContext,
  arrival: Arrival,
  acquisition: Acquisition,
): SampleRecord {
  return {
    segment: context.segment,
    sequence: context.sequence,
    setup: context.setup,
    purpose: step.purpose,
    cut: step.cut,
    target: step.target,
    axis: step.axis,
    angleDeg: step.angleDeg,
    component: step.component,
    attempt: context.attempt,
    startMonotonicMs: acquisition.startMonotonicMs,
    stopMonotonicMs: acquisition.stopMonotonicMs,
    timeLaw: acquisition.timeLaw,
    track: [{ monotonicMs: arrival.settledMonotonicMs, position: arrival.position }],
    traces: acquisition.traces,
  };
}
