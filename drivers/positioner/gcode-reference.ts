// Where the axes are and whether that can be trusted. Listens to everything the controller says, publishes
// each report as degrees, and notices what takes the reference away: a restart (told by its banner or betrayed
// by a position that falls to zero), an alarm, a closed link. Sends nothing.
import { type Observable, Subject } from 'rxjs';
import type { Clock } from '../clock.ts';
import { DriverError } from '../errors.ts';
import type { SenderEvent } from './gcode-events.ts';
import { alarmError } from './gcode-failures.ts';
import { alarmMeaning } from './gcode-meanings.ts';
import { isMoving, machinePosition, type StatusReport } from './gcode-reports.ts';
import type { AxisName, AxisSetup, Position, PositionReport } from './positioner.ts';
import { type AxisLimits, degreesOf } from './travel.ts';

const usualLetters = 'XYZABCUVW';
/** One report may be damaged into another valid one; two alike in a row are believed. */
const jumpReports = 2;
const zeroUnits = 0.0005;

export interface Placed {
  report: StatusReport;
  monotonicMs: number;
  position: Position;
  machine: readonly number[];
}

export class GcodeReference {
  readonly #axes: readonly AxisSetup[];
  readonly #clock: Clock;
  readonly #linkName: string;
  readonly #positions = new Subject<PositionReport>();
  readonly #faults = new Subject<DriverError>();
  #letters = usualLetters;
  #offset: readonly number[] | undefined;
  #last: Placed | undefined;
  #jumps = 0;
  #valid = false;
  #lostBecause: DriverError | undefined;
  #lastTrusted: Placed | undefined;
  /** The coordinates became doubtful with a motion of ours on its way: where it has led to nobody knows. */
  #lostInMotion = false;
  #coordinateDoubtful = false;
  #alarm: number | undefined;
  #limits: Readonly<Record<AxisName, AxisLimits>>;
  /** Set while a motion of ours is on its way: positions may change. */
  motionExpected = false;

  constructor(axes: readonly AxisSetup[], clock: Clock, linkName: string) {
    this.#axes = axes;
    this.#clock = clock;
    this.#linkName = linkName;
    this.#limits = Object.fromEntries(axes.map((axis) => [axis.name, axis]));
  }

  get valid(): boolean {
    return this.#valid;
  }

  get position$(): Observable<PositionReport> {
    return this.#positions;
  }

  /** What ends an operation under way: restart, alarm. A closed link ends it through the sender. */
  get faults$(): Observable<DriverError> {
    return this.#faults;
  }

  get last(): Placed | undefined {
    return this.#last;
  }

  /** The alarm that was told last and not left since. */
  get alarm(): number | undefined {
    return this.#alarm;
  }

  get limits(): Readonly<Record<AxisName, AxisLimits>> {
    return this.#limits;
  }

  /** Order of the axes in a report, and what the controller allows them. */
  learn(letters: string, limits: Readonly<Record<AxisName, AxisLimits>>): void {
    this.#letters = letters;
    this.#limits = limits;
  }

  get letters(): string {
    return this.#letters;
  }

  take(event: SenderEvent): void {
    if (event.kind === 'report') this.#takeReport(event.report, event.monotonicMs);
    else if (event.kind === 'alarm') this.#takeAlarm(event.number);
    else if (event.kind === 'restart') this.#takeRestart(event.banner, event.asked);
    else if (event.kind === 'closed') {
      this.#offset = undefined;
      this.lose(
        new DriverError(
          'POSITIONER_RESTARTED',
          `${this.#linkName} was reopened: its controller may have restarted`,
          {
            link: this.#linkName,
          },
        ),
        false,
      );
    }
  }

  /**
   * The coordinates are not to be trusted until the next homing. `coordinateDoubtful`: the controller's own
   * counter may have changed or the shaft run on, so that an axis without a switch cannot be believed either.
   */
  lose(because: DriverError, coordinateDoubtful: boolean): void {
    if (this.#valid) this.#lostBecause = because;
    this.#lostBecause ??= because;
    this.#valid = false;
    if (!coordinateDoubtful) return;
    this.#coordinateDoubtful = true;
    if (this.motionExpected) this.#lostInMotion = true;
  }

  /** The axes were homed, or are believed, at `placed`. */
  trust(placed: Placed): void {
    this.#valid = true;
    this.#lostBecause = undefined;
    this.#coordinateDoubtful = false;
    this.#lastTrusted = placed;
    this.#lostInMotion = false;
  }

  /** A place that a report alone would not prove: a move has ended there, and no restart was in between. */
  confirm(placed: Placed): void {
    if (this.#valid) this.#lastTrusted = placed;
  }

  /** All axes are at zero, where one of them was trusted to be elsewhere. */
  hasFallenToZero(now: Placed): boolean {
    return isZero(now.machine) && this.#lastTrusted !== undefined && !isZero(this.#lastTrusted.machine);
  }

  /** A connection stands. A restart on the first one took nothing away: nothing had been trusted before. */
  connected(): void {
    if (this.#lastTrusted) return;
    this.#lostBecause = undefined;
    this.#coordinateDoubtful = false;
    this.#lostInMotion = false;
  }

  /** The controller has been unlocked or homed. */
  clearAlarm(): void {
    this.#alarm = undefined;
  }

  /** Throws POSITIONER_RESTARTED or POSITIONER_REFERENCE_LOST while nothing is to be trusted. */
  check(): void {
    if (this.#valid) return;
    const because = this.#lostBecause;
    if (because?.code === 'POSITIONER_RESTARTED') {
      throw new DriverError(because.code, because.message, because.facts, because);
    }
    throw new DriverError(
      'POSITIONER_REFERENCE_LOST',
      `${this.#linkName}: the axes have to be homed before they move`,
      because?.facts ?? { link: this.#linkName },
      because,
    );
  }

  /** True when a restart since the last homing makes even a read position worthless. */
  get restarted(): boolean {
    return this.#lostBecause?.code === 'POSITIONER_RESTARTED';
  }

  /** The latest report shows a fall to zero that a second one has yet to confirm. */
  get suspectsRestart(): boolean {
    return this.#jumps > 0;
  }

  /**
   * Whether an axis without a switch may be believed at `position`: it never was trusted before (the zero at
   * connection is the axis's zero), or its counter went on without a break, or it stood still and stands where it
   * last stood. A place seen during a motion proves nothing: it may have been seen after the counter was lost.
   */
  isContinuous(axis: AxisSetup, position: Position): boolean {
    const before = this.#lastTrusted?.position[axis.name];
    const now = position[axis.name];
    if (before === undefined || !this.#coordinateDoubtful) return true;
    if (this.#lostInMotion) return false;
    return now !== undefined && Math.abs(now - before) <= axis.toleranceDeg;
  }

  /** A report in degrees; undefined while the work offset is not known or axes are missing from it. */
  place(report: StatusReport, monotonicMs: number): Placed | undefined {
    const machine = machinePosition(report, this.#offset);
    if (!machine) return undefined;
    const position: Record<AxisName, number> = {};
    for (const axis of this.#axes) {
      const index = this.#letters.indexOf(axis.word);
      const units = index < 0 ? undefined : machine[index];
      if (units === undefined) return undefined;
      position[axis.name] = degreesOf(axis, units);
    }
    return { report, monotonicMs, position, machine };
  }

  #takeReport(report: StatusReport, monotonicMs: number): void {
    if (report.offset) this.#offset = report.offset;
    const placed = this.place(report, monotonicMs);
    if (!placed) return;
    const previous = this.#last;
    if (this.#valid && previous && this.#fellToZero(previous, placed)) {
      this.#jumps += 1;
      if (this.#jumps < jumpReports) return;
      this.#fault(
        new DriverError(
          'POSITIONER_RESTARTED',
          `${this.#linkName} restarted unseen: its position fell to zero`,
          { link: this.#linkName, state: report.stateText },
        ),
      );
    }
    this.#jumps = 0;
    this.#last = placed;
    if (this.#valid && !this.hasFallenToZero(placed)) this.#lastTrusted = placed;
    this.#positions.next({
      monotonicMs,
      position: placed.position,
      moving: isMoving(report),
      state: report.stateText,
    });
  }

  /**
   * All axes at zero, where one of them stood elsewhere and had no motion to get there. During a motion of
   * ours zero may be on the way; a restart then shows in the mark that is read before and after each move.
   */
  #fellToZero(previous: Placed, now: Placed): boolean {
    if (this.motionExpected || isMoving(previous.report) || isMoving(now.report)) return false;
    if (!isZero(now.machine)) return false;
    return this.#axes.some((axis) => {
      const jumpDeg = Math.abs((now.position[axis.name] ?? 0) - (previous.position[axis.name] ?? 0));
      return jumpDeg > axis.toleranceDeg;
    });
  }

  #takeAlarm(number: number): void {
    this.#alarm = number;
    const error = alarmError(number, this.#linkName);
    if (!alarmMeaning(number).positionKnown) this.lose(error, true);
    this.#faults.next(error);
  }

  #takeRestart(banner: string, asked: boolean): void {
    this.#offset = undefined;
    // A reset that we asked for at rest keeps the counter; whoever asked in motion says so itself.
    if (asked) return;
    this.#fault(
      new DriverError('POSITIONER_RESTARTED', `${this.#linkName} restarted`, {
        link: this.#linkName,
        banner,
        monotonicMs: this.#clock.monotonicMs(),
      }),
    );
  }

  #fault(error: DriverError): void {
    this.lose(error, true);
    this.#faults.next(error);
  }
}

/** All axes where a restart puts them. */
export function isZero(machine: readonly number[]): boolean {
  return machine.every((units) => Math.abs(units) <= zeroUnits);
}
