// The positioner over a controller of the position-report family. One operation at a time; a stop goes past all
// of them. The procedures are in report-connect, -home, -move and -stop; this file keeps their order, what may be
// turning, and who is told when something goes wrong.
import type { Observable } from 'rxjs';
import type { Clock } from '../clock.ts';
import { DriverError } from '../errors.ts';
import type { Link } from '../link/link.ts';
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
import { connectReports } from './report-connect.ts';
import { homeReportAxes } from './report-home.ts';
import { driveReportLeg } from './report-move.ts';
import { askPosition, longestMotionMs, type ReportParts, restingPlace } from './report-parts.ts';
import { ReportReference } from './report-reference.ts';
import { type OnReportTraffic, ReportSender } from './report-sender.ts';
import { stopReportAxes } from './report-stop.ts';
import { checkTarget, planLegs, settleMsOf, standsOf } from './travel.ts';

export interface ReportPositionerOptions {
  axes: readonly AxisSetup[];
  /** Told of every line on the wire. */
  onTraffic?: OnReportTraffic;
  /** See GcodePositionerOptions: believes the zero of an axis without a switch even after a restart. */
  believeZeroAfterRestart?: boolean;
}

export class ReportPositioner implements Positioner {
  readonly axes: readonly AxisSetup[];
  readonly #parts: ReportParts;
  readonly #believeZero: boolean;
  readonly #turns: OperationTurns;
  /** Coordinates at which axes came to rest from their approach side, by our own last move. */
  #arrivedDeg: Record<AxisName, number> = {};

  constructor(link: Link, clock: Clock, options: ReportPositionerOptions) {
    this.axes = options.axes;
    this.#believeZero = options.believeZeroAfterRestart ?? false;
    const sender = new ReportSender(link, clock, options.onTraffic);
    const reference = new ReportReference(options.axes, clock, link.name);
    this.#parts = {
      axes: options.axes,
      link,
      clock,
      sender,
      reference,
      limits: Object.fromEntries(options.axes.map((axis) => [axis.name, axis])),
      stopsAtOnce: false,
    };
    sender.events$.subscribe((event) => reference.take(event));
    this.#turns = new OperationTurns({
      stop: (underway) => this.#stopAxes(underway),
      seenMoving: () => this.#foreignMotion,
      expectMotion: (expected) => {
        reference.motionExpected = expected;
      },
      // It came to rest elsewhere, behind a barrier; or halted, or restarted.
      atRestAfter: ['POSITIONER_ALARM', 'POSITIONER_RESTARTED', 'POSITIONER_WRONG_PLACE'],
    });
    reference.faults$.subscribe((error) => this.#turns.fault(error));
  }

  get referenceValid(): boolean {
    return this.#parts.reference.valid;
  }

  /** During a move only where the build tells true positions in motion; otherwise its start and its end. */
  get position$(): Observable<PositionReport> {
    return this.#parts.reference.position$;
  }

  /**
   * Throws LINK_OPEN_FAILED, POSITIONER_NOT_ANSWERING, POSITIONER_UNEXPECTED_CONTROLLER,
   * POSITIONER_BUSY_AT_CONNECT, POSITIONER_UNSAFE_SETTING, POSITIONER_ALARM (still halted). After BUSY_AT_CONNECT
   * the link stays open: stop() brings the machine to rest, and identify() can be asked again.
   */
  identify(signal?: AbortSignal): Promise<ControllerIdentity> {
    const onBusy = (): void => {
      this.#foreignMotion = true;
    };
    return this.#turns.exclusive(signal, (both) => connectReports(this.#parts, onBusy, both), {
      ridesOutRestarts: true,
    });
  }

  /** Found in motion at connection: a stop has to end it, but we do not by ourselves. */
  #foreignMotion = false;

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
      await homeReportAxes(this.#parts, { believeZeroAfterRestart: this.#believeZero, onMotion }, both);
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
      let position = await restingPlace(this.#parts, longestMotionMs(this.#parts) * 1.5 + 5_000, signal);
      const legs = planLegs(
        this.axes,
        standsOf(this.axes, this.#arrivedDeg, position),
        target,
        options.throughApproach,
      );
      const arrivedDeg = this.#arrivedDeg;
      this.#arrivedDeg = {};
      for (const leg of legs) {
        position = await driveReportLeg(this.#parts, position, leg, () => this.#turns.moves('move'), signal);
      }
      this.#turns.atRest();
      await this.#parts.clock.sleep(settleMsOf(this.axes, target), signal);
      this.#arrivedDeg = { ...arrivedDeg, ...target };
      return { position, settledMonotonicMs: this.#parts.clock.monotonicMs() };
    });
  }

  /**
   * A stop in motion costs the reference, since this family stops dead; see report-stop.ts.
   * Throws POSITIONER_STOP_UNCONFIRMED. A second call while one is under way is told the same outcome.
   */
  stop(): Promise<StopReport> {
    return this.#turns.stop();
  }

  /** At rest; in motion the answer is the target. Throws POSITIONER_RESTARTED after a restart until homed. */
  async readPosition(signal?: AbortSignal): Promise<Position> {
    if (this.#parts.reference.restarted) this.#parts.reference.check();
    const position = await askPosition(this.#parts, signal);
    if (this.#parts.reference.restarted) this.#parts.reference.check();
    if (this.#turns.underway === 'nothing') this.#parts.reference.publish(position, false);
    return position;
  }

  /** Closes the link; whatever moves goes on to the end of its leg. Call stop() first. */
  async close(): Promise<void> {
    this.#turns.fail(new DriverError('LINK_CLOSED', `${this.#parts.link.name} was closed by us`, {}));
    await this.#parts.link.close();
  }

  async #stopAxes(underway: Underway): Promise<StopReport> {
    const stopped = stopReportAxes(this.#parts, underway);
    this.#arrivedDeg = {};
    const report = await stopped;
    this.#foreignMotion = false;
    return report;
  }
}
