// Where the axes of a position-report controller are, and whether that can be trusted. Turns reports into
// degrees, publishes those that are true, and keeps what takes the reference away: a restart, a halt, a closed
// link, a quick stop in motion. Sends nothing.
import { type Observable, Subject } from 'rxjs';
import type { Clock } from '../clock.ts';
import { DriverError } from '../errors.ts';
import type { AxisName, AxisSetup, Position, PositionReport } from './positioner.ts';
import { haltedError, restartedError } from './report-failures.ts';
import type { ByLetter, ReportLine } from './report-lines.ts';
import type { ReportEvent } from './report-sender.ts';
import { reportRounding } from './report-settings.ts';
import { degreesOf } from './travel.ts';

export class ReportReference {
  readonly #axes: readonly AxisSetup[];
  readonly #clock: Clock;
  readonly #linkName: string;
  readonly #positions = new Subject<PositionReport>();
  readonly #faults = new Subject<DriverError>();
  #valid = false;
  #lostBecause: DriverError | undefined;
  #coordinateDoubtful = false;
  #lostInMotion = false;
  #lastRest: Position | undefined;
  /** Set while a motion of ours is on its way. */
  motionExpected = false;
  /** Steps per unit as told; makes positions finer than their two decimals. */
  steps: ByLetter = {};

  constructor(axes: readonly AxisSetup[], clock: Clock, linkName: string) {
    this.#axes = axes;
    this.#clock = clock;
    this.#linkName = linkName;
  }

  get valid(): boolean {
    return this.#valid;
  }

  get position$(): Observable<PositionReport> {
    return this.#positions;
  }

  /** What ends an operation under way: restart, halt. A closed link ends it through the sender. */
  get faults$(): Observable<DriverError> {
    return this.#faults;
  }

  /** Where the axes were last known to rest. */
  get lastRest(): Position | undefined {
    return this.#lastRest;
  }

  /** True when a restart since the last homing makes even a read position worthless. */
  get restarted(): boolean {
    return this.#lostBecause?.code === 'POSITIONER_RESTARTED';
  }

  take(event: ReportEvent): void {
    if (event.kind === 'halted') this.#fault(haltedError(event.text, this.#linkName));
    else if (event.kind === 'restart') {
      const how = event.seen ? 'it said so' : 'its line counter is gone';
      this.#fault(restartedError(this.#linkName, how));
    } else if (event.kind === 'closed') {
      this.lose(restartedError(this.#linkName, 'its link was closed, which may reset it'), false);
    }
  }

  /** `coordinateDoubtful`: the counter may have changed, or the shaft run on: no switch, no belief. */
  lose(because: DriverError, coordinateDoubtful: boolean): void {
    if (this.#valid) this.#lostBecause = because;
    this.#lostBecause ??= because;
    // A restart outweighs what was known before it.
    if (because.code === 'POSITIONER_RESTARTED') this.#lostBecause = because;
    this.#valid = false;
    if (!coordinateDoubtful) return;
    this.#coordinateDoubtful = true;
    if (this.motionExpected) this.#lostInMotion = true;
  }

  /** The axes were homed, or are believed, at `position`. */
  trust(position: Position): void {
    this.#valid = true;
    this.#lostBecause = undefined;
    this.#coordinateDoubtful = false;
    this.#lostInMotion = false;
    this.#lastRest = position;
  }

  /** A connection stands. Where nothing was ever trusted, whatever came before it, a boot included, is no loss. */
  connected(): void {
    if (this.#lastRest !== undefined) return;
    this.#lostBecause = undefined;
    this.#coordinateDoubtful = false;
    this.#lostInMotion = false;
  }

  /** Throws POSITIONER_RESTARTED or POSITIONER_REFERENCE_LOST while nothing is to be trusted. */
  check(): void {
    if (this.#valid) return;
    const because = this.#lostBecause;
    if (because?.code === 'POSITIONER_RESTARTED')
      throw new DriverError(because.code, because.message, because.facts, because);
    throw new DriverError(
      'POSITIONER_REFERENCE_LOST',
      `${this.#linkName}: the axes have to be homed before they move`,
      because?.facts ?? { link: this.#linkName },
      because,
    );
  }

  /**
   * Whether an axis without a switch may be believed at `position`: it never was trusted before, its counter went
   * on without a break, or it stood still and stands where it last stood.
   */
  isContinuous(axis: AxisSetup, position: Position): boolean {
    const before = this.#lastRest?.[axis.name];
    const now = position[axis.name];
    if (before === undefined || !this.#coordinateDoubtful) return true;
    if (this.#lostInMotion) return false;
    return now !== undefined && Math.abs(now - before) <= axis.toleranceDeg;
  }

  /** A position line in degrees; throws POSITIONER_UNEXPECTED_CONTROLLER where an axis is missing from it. */
  place(line: Extract<ReportLine, { kind: 'position' }>): Position {
    const position: Record<AxisName, number> = {};
    for (const axis of this.#axes) {
      const units = line.units[axis.word];
      if (units === undefined) {
        const letters = Object.keys(line.units).join('');
        throw new DriverError(
          'POSITIONER_UNEXPECTED_CONTROLLER',
          `${this.#linkName} has the axes ${letters}, not ${axis.word}`,
          { axes: letters, wanted: this.#axes.map((each) => each.word).join('') },
        );
      }
      position[axis.name] = degreesOf(axis, this.#finer(units, line.counts[axis.word], axis.word));
    }
    return position;
  }

  /** The step counter is exact; after a zero was set by hand it counts from elsewhere and is left alone. */
  #finer(units: number, count: number | undefined, letter: string): number {
    const perUnit = this.steps[letter];
    if (count === undefined || perUnit === undefined) return units;
    const counted = count / perUnit;
    return Math.abs(counted - units) <= reportRounding + 0.5 / perUnit ? counted : units;
  }

  /** Told by the procedures, which alone know whether what was reported is where the axes are. */
  publish(position: Position, moving: boolean): void {
    if (!moving && this.#valid) this.#lastRest = position;
    this.#positions.next({
      monotonicMs: this.#clock.monotonicMs(),
      position,
      moving,
      state: moving ? 'moving' : 'at rest',
    });
  }

  #fault(error: DriverError): void {
    this.lose(error, true);
    this.#faults.next(error);
  }
}
