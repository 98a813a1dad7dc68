// The positioner over a controller of the realtime-status family. One operation at a time; a stop goes past
// all of them. The procedures themselves are in gcode-connect, -home, -move and -stop; this file keeps their
// order, what may be turning, and who is told when something goes wrong.
import type { Observable } from 'rxjs';
import type { Clock } from '../clock.ts';
import { DriverError, isDriverError } from '../errors.ts';
import type { Link } from '../link/link.ts';
import { connect } from './gcode-connect.ts';
import { homeAxes } from './gcode-home.ts';
import { checkMemory, forgetMark, proveMemory } from './gcode-memory.ts';
import { driveLeg, lookIntoFailure, readBack } from './gcode-move.ts';
import { awaitRest, type GcodeParts, readPlaced } from './gcode-parts.ts';
import { GcodeReference, type Placed } from './gcode-reference.ts';
import { isMoving } from './gcode-reports.ts';
import { GcodeSender, type OnTraffic } from './gcode-sender.ts';
import { stopAxes, type Underway } from './gcode-stop.ts';
import type {
  Arrival,
  AxisName,
  AxisSetup,
  ControllerIdentity,
  Position,
  Positioner,
  PositionReport,
  StopReport,
} from './positioner.ts';
import { checkTarget, planLegs, type Stand } from './travel.ts';

export interface GcodePositionerOptions {
  axes: readonly AxisSetup[];
  /** Told of every line and urgent byte on the wire. */
  onTraffic?: OnTraffic;
  /**
   * An axis without a homing switch loses its zero when the controller restarts away from it. Normally home()
   * then refuses, since the cable would be wound from a false zero; `true` believes the new zero all the same.
   */
  believeZeroAfterRestart?: boolean;
}

export class GcodePositioner implements Positioner {
  readonly axes: readonly AxisSetup[];
  readonly #parts: GcodeParts;
  readonly #believeZero: boolean;
  #queue: Promise<unknown> = Promise.resolve();
  #operation: { ends: AbortController; ridesOutRestarts: boolean } | undefined;
  #stopping: Promise<StopReport> | undefined;
  #stops = 0;
  #underway: Underway = 'nothing';
  /** Coordinates at which axes came to rest from their approach side, by our own last move. */
  #arrivedDeg: Record<AxisName, number> = {};

  constructor(link: Link, clock: Clock, options: GcodePositionerOptions) {
    this.axes = options.axes;
    this.#believeZero = options.believeZeroAfterRestart ?? false;
    const sender = new GcodeSender(link, clock, options.onTraffic);
    const reference = new GcodeReference(options.axes, clock, link.name);
    this.#parts = {
      axes: options.axes,
      link,
      clock,
      sender,
      reference,
      settings: new Map(),
      memoryMark: 'missing',
    };
    sender.events$.subscribe((event) => {
      reference.take(event);
      // A reset of our own takes the mark along and is no reason to suspect another.
      if (event.kind === 'restart' && event.asked) forgetMark(this.#parts);
    });
    reference.faults$.subscribe((error) => {
      if (!this.#operation?.ridesOutRestarts) this.#fail(error);
    });
  }

  get referenceValid(): boolean {
    return this.#parts.reference.valid;
  }

  get countUnbroken(): boolean {
    return this.#parts.countUnbroken ?? false;
  }

  get position$(): Observable<PositionReport> {
    return this.#parts.reference.position$;
  }

  /**
   * Throws LINK_OPEN_FAILED, POSITIONER_NOT_ANSWERING, POSITIONER_UNEXPECTED_CONTROLLER,
   * POSITIONER_BUSY_AT_CONNECT, POSITIONER_UNSAFE_SETTING, POSITIONER_BAD_ANSWER. After BUSY_AT_CONNECT or
   * NOT_ANSWERING the link stays open: stop() brings the machine to rest, and identify() can be asked again.
   */
  identify(signal?: AbortSignal): Promise<ControllerIdentity> {
    return this.#exclusive(signal, (both) => connect(this.#parts, both), { ridesOutRestarts: true });
  }

  home(signal?: AbortSignal): Promise<void> {
    return this.#exclusive(signal, async (both) => {
      this.#arrivedDeg = {};
      const onMotion = (): void => {
        this.#moves('homing');
        this.#parts.reference.lose(
          new DriverError('POSITIONER_REFERENCE_LOST', 'homing was begun and not ended', {}),
          false,
        );
      };
      await homeAxes(this.#parts, { believeZeroAfterRestart: this.#believeZero, onMotion }, both);
      this.#atRest();
    });
  }

  async moveTo(
    target: Position,
    options: { throughApproach?: boolean; signal?: AbortSignal } = {},
  ): Promise<Arrival> {
    checkTarget(this.axes, target);
    return this.#exclusive(options.signal, async (signal) => {
      this.#parts.reference.check();
      const placed = await awaitRest(this.#parts, signal);
      await proveMemory(this.#parts, placed, signal);
      const legs = planLegs(this.axes, this.#stands(placed.position), target, options.throughApproach);
      const arrivedDeg = this.#arrivedDeg;
      this.#arrivedDeg = {};
      const { position } = await this.#drive(placed.position, legs, target, signal);
      this.#atRest();
      await this.#parts.clock.sleep(this.#settleMs(target), signal);
      this.#arrivedDeg = { ...arrivedDeg, ...target };
      return { position, settledMonotonicMs: this.#parts.clock.monotonicMs() };
    });
  }

  /** Throws POSITIONER_STOP_UNCONFIRMED. A second call while one is under way is told the same outcome. */
  stop(): Promise<StopReport> {
    this.#stopping ??= this.#stop().finally(() => {
      this.#stopping = undefined;
    });
    return this.#stopping;
  }

  /** Throws POSITIONER_RESTARTED after a restart until the axes were homed; before any homing it reads freely. */
  async readPosition(signal?: AbortSignal): Promise<Position> {
    if (this.#parts.reference.restarted) this.#parts.reference.check();
    const { position } = await readPlaced(this.#parts, signal);
    if (this.#parts.reference.restarted) this.#parts.reference.check();
    return position;
  }

  /** Closes the link; whatever moves goes on to the end of its leg. Call stop() first. */
  async close(): Promise<void> {
    this.#fail(new DriverError('LINK_CLOSED', `${this.#parts.link.name} was closed by us`, {}));
    await this.#parts.link.close();
  }

  async #drive(
    fromDeg: Position,
    legs: readonly Position[],
    target: Position,
    signal: AbortSignal,
  ): Promise<Placed> {
    try {
      let atDeg = fromDeg;
      for (const leg of legs) {
        await driveLeg(this.#parts, atDeg, leg, () => this.#moves('move'), signal);
        atDeg = { ...atDeg, ...leg };
      }
      const placed = await readBack(this.#parts, target, signal);
      await checkMemory(this.#parts, signal);
      this.#parts.reference.confirm(placed);
      return placed;
    } catch (error) {
      await lookIntoFailure(this.#parts, error, signal);
      throw error;
    }
  }

  async #stop(): Promise<StopReport> {
    this.#stops += 1;
    const { reference } = this.#parts;
    const looksMoving = reference.last !== undefined && isMoving(reference.last.report);
    const underway = this.#underway === 'nothing' && looksMoving ? 'move' : this.#underway;
    const stopped = stopAxes(this.#parts, underway);
    this.#arrivedDeg = {};
    this.#fail(new DriverError('POSITIONER_STOPPED', 'stopped on request', { underway }));
    const report = await stopped;
    this.#atRest();
    return report;
  }

  /** Runs one operation after those before it; a fault or a stop ends it, and a move it leaves behind is stopped. */
  #exclusive<T>(
    signal: AbortSignal | undefined,
    act: (signal: AbortSignal) => Promise<T>,
    { ridesOutRestarts = false } = {},
  ): Promise<T> {
    const stops = this.#stopping ? Number.NaN : this.#stops;
    const turn = this.#queue.then(async () => {
      if (stops !== this.#stops)
        throw new DriverError('POSITIONER_STOPPED', 'a stop came before this could begin');
      const ends = new AbortController();
      this.#operation = { ends, ridesOutRestarts };
      try {
        return await act(signal ? AbortSignal.any([signal, ends.signal]) : ends.signal);
      } catch (error) {
        throw await this.#clearUp(error);
      } finally {
        this.#operation = undefined;
      }
    });
    // The caller has the failure; the queue only keeps the order.
    this.#queue = turn.catch(() => {});
    return turn;
  }

  /** What to throw in the end: an operation that failed in motion is followed by a stop, unless that is pointless. */
  async #clearUp(error: unknown): Promise<unknown> {
    if (this.#underway === 'nothing' || this.#stopping) return error;
    // Held: the lock belongs to whoever stands at the machine. Alarm, restart: nothing moves, nothing is queued.
    if (isDriverError(error, 'POSITIONER_HELD', 'LINK_CLOSED')) return error;
    if (isDriverError(error, 'POSITIONER_ALARM', 'POSITIONER_RESTARTED')) {
      this.#atRest();
      return error;
    }
    try {
      await this.stop();
      return error;
    } catch (unconfirmed) {
      if (!isDriverError(unconfirmed)) return unconfirmed;
      return new DriverError(unconfirmed.code, unconfirmed.message, unconfirmed.facts, error);
    }
  }

  #fail(error: DriverError): void {
    this.#operation?.ends.abort(error);
  }

  #moves(underway: Underway): void {
    this.#underway = underway;
    this.#parts.reference.motionExpected = true;
  }

  #atRest(): void {
    this.#underway = 'nothing';
    this.#parts.reference.motionExpected = false;
  }

  /** Where each axis stands: where we sent it, as long as it is still there; otherwise where it says to be. */
  #stands(position: Position): Record<AxisName, Stand> {
    return Object.fromEntries(
      this.axes.map((axis) => {
        const reportedDeg = position[axis.name] ?? Number.NaN;
        const sentDeg = this.#arrivedDeg[axis.name];
        const takenUp = sentDeg !== undefined && Math.abs(sentDeg - reportedDeg) <= axis.toleranceDeg;
        return [axis.name, { deg: takenUp ? sentDeg : reportedDeg, takenUp }];
      }),
    );
  }

  #settleMs(target: Position): number {
    const named = this.axes.filter((axis) => target[axis.name] !== undefined);
    return Math.max(0, ...named.map((axis) => axis.settleMs));
  }
}
