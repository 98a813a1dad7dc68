// The whole job of the positioner driver against a quirky controller, in simulated time: identify, home, moves
// with trouble in between, stops at rest, in motion and over a dead link, close. Every outcome is judged by where
// the shafts really stand: a true arrival, a true halt, or a typed error, and none later than a bound.
import { DriverError } from '../../drivers/errors.ts';
import { MemoryPort } from '../../drivers/link/memory.ts';
import { GcodePositioner } from '../../drivers/positioner/gcode-positioner.ts';
import type { AxisSetup, Position } from '../../drivers/positioner/positioner.ts';
import { SimulatedClock } from '../../mocks/simulated-clock.ts';
import { azimuth } from './positioner-rig.ts';
import { QuirkyController } from './quirky-controller.ts';
import type { ControllerQuirks } from './quirky-controller-habits.ts';

/** What happens so long after a move began; a stop is asked of the driver, the rest befalls the controller. */
export interface Trouble {
  kind: 'none' | 'stop' | 'restart' | 'drop-link' | 'drop-and-stop' | 'hold' | 'limit';
  afterMs: number;
}

export interface PositionerJob {
  quirks: Partial<ControllerQuirks>;
  seed?: number;
  homing?: AxisSetup['homing'];
  moves?: readonly Move[];
}

export interface Move {
  azimuth: number;
  trouble?: Trouble;
}

export interface PositionerOutcome {
  controller: QuirkyController;
  failures: string[];
  errors: DriverError[];
  arrivals: number;
  stops: number;
}

const stepMs = 400_000;
const defaultMoves: readonly Move[] = [{ azimuth: 30 }, { azimuth: -12.34 }, { azimuth: 90 }];

export async function runPositionerJob(job: PositionerJob): Promise<PositionerOutcome> {
  const clock = new SimulatedClock();
  const controller = new QuirkyController(clock, job.quirks, chances(job.seed ?? 1));
  const port = new MemoryPort(clock, 'memory://quirky', { latencyMs: 2 });
  port.listen(controller.accept);
  const axis: AxisSetup = { ...azimuth, homing: job.homing ?? 'none' };
  const positioner = new GcodePositioner(port.link(), clock, { axes: [axis] });
  const outcome: PositionerOutcome = { controller, failures: [], errors: [], arrivals: 0, stops: 0 };

  const step = async <T>(name: string, work: () => Promise<T>): Promise<T | undefined> => {
    const begunMs = clock.monotonicMs();
    const timely = (): void => {
      const tookMs = clock.monotonicMs() - begunMs;
      if (tookMs > stepMs) throw new Error(`${name} took ${tookMs} ms`);
    };
    try {
      return await clock.run(work().finally(timely));
    } catch (error) {
      if (!(error instanceof DriverError)) throw error;
      if (error.message.length < 10) throw new Error(`${name}: '${error.message}' tells nothing`);
      outcome.failures.push(`${name}: ${error.code}`);
      outcome.errors.push(error);
      return undefined;
    }
  };

  const stop = async (): Promise<boolean> => {
    const report = await step('stop', () => positioner.stop());
    if (!report) return false;
    if (controller.moving) throw new Error('a halt was confirmed and a shaft turns');
    outcome.stops += 1;
    return true;
  };

  /** The last thing that failed was a move in alarm: the lock is left by homing. */
  const locked = (): boolean => outcome.failures.at(-1) === 'move: POSITIONER_ALARM';

  /** What a run does to be able to move: connect, home; stop what moves. False when that does not help. */
  const makeReady = async (): Promise<boolean> => {
    for (let tried = 0; tried < 3; tried += 1) {
      if (positioner.referenceValid && !locked()) return true;
      const identified = await step('identify', () => positioner.identify());
      if (identified && (await step('home', () => positioner.home().then(() => true)))) return true;
      await stop();
    }
    return positioner.referenceValid && !locked();
  };

  const arrive = async (target: Position, trouble: Trouble | undefined): Promise<void> => {
    const stopping: Promise<unknown>[] = [];
    if (trouble) clock.at(clock.monotonicMs() + trouble.afterMs, () => stopping.push(befall(trouble)));
    const arrival = await step('move', () => positioner.moveTo(target));
    if (arrival) {
      requireAt(controller, axis, target);
      if (arrival.settledMonotonicMs > clock.monotonicMs()) throw new Error('settled in the future');
      outcome.arrivals += 1;
    }
    if (trouble) await clock.run(clock.sleep(trouble.afterMs));
    await clock.run(Promise.all(stopping));
  };

  const befall = async (trouble: Trouble): Promise<void> => {
    if (trouble.kind === 'restart') controller.restart();
    else if (trouble.kind === 'hold') controller.pressHold();
    else if (trouble.kind === 'limit') controller.trip(1);
    if (trouble.kind === 'drop-link' || trouble.kind === 'drop-and-stop') controller.dropLink();
    if (trouble.kind !== 'stop' && trouble.kind !== 'drop-and-stop') return;
    try {
      await positioner.stop();
      if (controller.moving) outcome.failures.push('FALSE HALT');
      outcome.stops += 1;
    } catch (error) {
      if (!(error instanceof DriverError)) throw error;
      outcome.failures.push(`stop: ${error.code}`);
      outcome.errors.push(error);
    }
  };

  await makeReady();
  for (const { azimuth: target, trouble } of job.moves ?? defaultMoves) {
    if (!(await makeReady())) break;
    await arrive({ azimuth: target }, trouble);
  }
  await stop();
  await step('close', () => positioner.close());
  await clock.run(clock.sleep(60_000));
  if (controller.moving) throw new Error('something still moves');
  if (outcome.failures.includes('FALSE HALT')) throw new Error('a halt was confirmed and a shaft turned');
  const { min, max } = controller.extremes;
  if (min < axis.travelMinDeg - 0.02 || max > axis.travelMaxDeg + 0.02)
    throw new Error(`a shaft was at ${min} or ${max}`);
  return outcome;
}

function requireAt(controller: QuirkyController, axis: AxisSetup, target: Position): void {
  const at = controller.shafts[0] ?? Number.NaN;
  const wanted = target[axis.name] ?? Number.NaN;
  if (controller.moving) throw new Error('an arrival was told and the shaft turns');
  if (Math.abs(at - wanted) > axis.toleranceDeg + 1e-9)
    throw new Error(`told to be at ${wanted} and is at ${at}`);
}

/** A small generator of its own (a linear congruence of 32 bits): the same seed, the same numbers. */
function chances(seed: number): () => number {
  let state = (seed * 2_654_435_761) >>> 0;
  return () => {
    state = (Math.imul(state, 1_664_525) + 1_013_904_223) >>> 0;
    return state / 2 ** 32;
  };
}
