// The positioner over a controller of the position-report family. One operation at a time; a stop goes past all
// of them. The procedures are in report-connect, -home, -move and -stop; this file keeps their order, what may be
// turning, and who is told when something goes wrong.
import type { Observable } from 'rxjs';
import type { Clock } from '../clock.ts';
import { DriverError, isDriverError } from '../errors.ts';
import type { Link } from '../link/link.ts';
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
import { type ReportUnderway, stopReportAxes } from './report-stop.ts';
import { checkTarget, planLegs, type Stand } from './travel.ts';

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
  #queue: Promise<unknown> = Promise.resolve();
  #operation: { ends: AbortController; ridesOutRestarts: boolean } | undefined;
  #stopping: Promise<StopReport> | undefined;
  #stops = 0;
  #underway: ReportUnderway = 'nothing';
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
    reference.faults$.subscribe((error) => {
      if (!this.#operation?.ridesOutRestarts) this.#fail(error);
    });
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
    return this.#exclusive(signal, (both) => connectReports(this.#parts, onBusy, both), {
      ridesOutRestarts: true,
    });
  }

  /** Found in motion at connection: a stop has to end it, but we do not by ourselves. */
  #foreignMotion = false;

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
      await homeReportAxes(this.#parts, { believeZeroAfterRestart: this.#believeZero, onMotion }, both);
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
      let position = await restingPlace(this.#parts, longestMotionMs(this.#parts) * 1.5 + 5_000, signal);
      const legs = planLegs(this.axes, this.#stands(position), target, options.throughApproach);
      const arrivedDeg = this.#arrivedDeg;
      this.#arrivedDeg = {};
      for (const leg of legs) {
        position = await driveReportLeg(this.#parts, position, leg, () => this.#moves('move'), signal);
      }
      this.#atRest();
      await this.#parts.clock.sleep(this.#settleMs(target), signal);
      this.#arrivedDeg = { ...arrivedDeg, ...target };
      return { position, settledMonotonicMs: this.#parts.clock.monotonicMs() };
    });
  }

  /**
   * A stop in motion costs the reference, since this family stops dead; see report-stop.ts.
   * Throws POSITIONER_STOP_UNCONFIRMED. A second call while one is under way is told the same outcome.
   */
  stop(): Promise<StopReport> {
    this.#stopping ??= this.#stop().finally(() => {
      this.#stopping = undefined;
    });
    return this.#stopping;
  }

  /** At rest; in motion the answer is the target. Throws POSITIONER_RESTARTED after a restart until homed. */
  async readPosition(signal?: AbortSignal): Promise<Position> {
    if (this.#parts.reference.restarted) this.#parts.reference.check();
    const position = await askPosition(this.#parts, signal);
    if (this.#parts.reference.restarted) this.#parts.reference.check();
    if (this.#underway === 'nothing') this.#parts.reference.publish(position, false);
    return position;
  }

  /** Closes the link; whatever moves goes on to the end of its leg. Call stop() first. */
  async close(): Promise<void> {
    this.#fail(new DriverError('LINK_CLOSED', `${this.#parts.link.name} was closed by us`, {}));
    await this.#parts.link.close();
  }

  async #stop(): Promise<StopReport> {
    this.#stops += 1;
    const underway = this.#underway === 'nothing' && this.#foreignMotion ? 'move' : this.#underway;
    const stopped = stopReportAxes(this.#parts, underway);
    this.#arrivedDeg = {};
    this.#fail(new DriverError('POSITIONER_STOPPED', 'stopped on request', { underway }));
    const report = await stopped;
    this.#foreignMotion = false;
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
    if (isDriverError(error, 'POSITIONER_HELD', 'LINK_CLOSED')) return error;
    // It came to rest elsewhere, behind a barrier; or halted, or restarted: nothing moves, nothing is queued.
    if (isDriverError(error, 'POSITIONER_ALARM', 'POSITIONER_RESTARTED', 'POSITIONER_WRONG_PLACE')) {
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

  #moves(underway: ReportUnderway): void {
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
