// The positioner over a controller of the realtime-status family. One operation at a time; a stop goes past
// all of them. The procedures themselves are in gcode-connect, -home, -move and -stop; this file keeps their
// order, what may be turning, and who is told when something goes wrong.
import type { Observable } from 'rxjs';
import type { Clock } from '../clock.ts';
import { DriverError } from '../errors.ts';
import type { Link } from '../link/link.ts';
import { connect } from './gcode-connect.ts';
import { homeAxes } from './gcode-home.ts';
import { checkMemory, forgetMark, proveMemory } from './gcode-memory.ts';
import { driveLeg, lookIntoFailure, readBack } from './gcode-move.ts';
import { awaitRest, type GcodeParts, readPlaced } from './gcode-parts.ts';
import { GcodeReference, type Placed } from './gcode-reference.ts';
import { isMoving } from './gcode-reports.ts';
import { GcodeSender, type OnTraffic } from './gcode-sender.ts';
import { stopAxes } from './gcode-stop.ts';
import { OperationTurns, type Underway } from './operation-turns.ts';
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
import { checkTarget, planLegs, settleMsOf, standsOf } from './travel.ts';

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
  readonly #turns: OperationTurns;
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
    this.#turns = new OperationTurns({
      stop: (underway) => this.#stopAxes(underway),
      seenMoving: () => reference.last !== undefined && isMoving(reference.last.report),
      expectMotion: (expected) => {
        reference.motionExpected = expected;
      },
      atRestAfter: ['POSITIONER_ALARM', 'POSITIONER_RESTARTED'],
    });
    reference.faults$.subscribe((error) => this.#turns.fault(error));
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
    return this.#turns.exclusive(signal, (both) => connect(this.#parts, both), { ridesOutRestarts: true });
  }

  home(signal?: AbortSignal): Promise<void> {
    return this.#turns.exclusive(signal, async (both) => {
      this.#arrivedDeg = {};
      const onMotion = (): void => {
        this.#turns.moves('homing');
        this.#parts.reference.lose(
          new DriverError('POSITIONER_REFERENCE_LOST', 'homing was begun and not ended', {}),
          false,
        );
      };
      await homeAxes(this.#parts, { believeZeroAfterRestart: this.#believeZero, onMotion }, both);
      this.#turns.atRest();
    });
  }

  async moveTo(
    target: Position,
    options: { throughApproach?: boolean; signal?: AbortSignal } = {},
  ): Promise<Arrival> {
    checkTarget(this.axes, target);
    return this.#turns.exclusive(options.signal, async (signal) => {
      this.#parts.reference.check();
      const placed = await awaitRest(this.#parts, signal);
      await proveMemory(this.#parts, placed, signal);
      const legs = planLegs(
        this.axes,
        standsOf(this.axes, this.#arrivedDeg, placed.position),
        target,
        options.throughApproach,
      );
      const arrivedDeg = this.#arrivedDeg;
      this.#arrivedDeg = {};
      const { position } = await this.#drive(placed.position, legs, target, signal);
      this.#turns.atRest();
      await this.#parts.clock.sleep(settleMsOf(this.axes, target), signal);
      this.#arrivedDeg = { ...arrivedDeg, ...target };
      return { position, settledMonotonicMs: this.#parts.clock.monotonicMs() };
    });
  }

  /** Throws POSITIONER_STOP_UNCONFIRMED. A second call while one is under way is told the same outcome. */
  stop(): Promise<StopReport> {
    return this.#turns.stop();
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
    this.#turns.fail(new DriverError('LINK_CLOSED', `${this.#parts.link.name} was closed by us`, {}));
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
        await driveLeg(this.#parts, atDeg, leg, () => this.#turns.moves('move'), signal);
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

  #stopAxes(underway: Underway): Promise<StopReport> {
    const stopped = stopAxes(this.#parts, underway);
    this.#arrivedDeg = {};
    return stopped;
  }
}
