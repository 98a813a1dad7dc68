// Judges one straight move while it runs, from the reports alone. Pure: fed with reports and times, it says
// whether the move is under way, whether an answer must have got lost, or what is wrong.
import { DriverError } from '../errors.ts';
import type { Placed } from './gcode-reference.ts';
import { isHeld } from './gcode-reports.ts';
import type { AxisSetup, Position } from './positioner.ts';

/** No progress for so long while the controller says that it runs. */
const stallMs = 3_000;
/** At rest for so long while an answer is owed: the answer, or the line itself, was lost. */
const idleMs = 2_000;
/** The slowest feed override is a tenth of the rate. */
const slowestOverride = 10;
const graceMs = 60_000;
/** The quickest feed override is twice the rate; and half as much again for what the plan does not know. */
const quickestShare = 1 / 3;
/** One report may be damaged; two in a row off the path are believed. */
const strayReports = 2;

export interface Leg {
  fromDeg: Position;
  toDeg: Position;
  plannedMs: number;
}

export type LegVerdict =
  | { kind: 'under way' }
  | { kind: 'answer lost' }
  | { kind: 'fault'; error: DriverError };

const underWay: LegVerdict = { kind: 'under way' };

export class LegWatch {
  readonly #axes: readonly AxisSetup[];
  readonly #leg: Leg;
  readonly #startedMs: number;
  #progressMs: number;
  #progressAt: Position;
  #idleSinceMs: number | undefined;
  #strays = 0;

  constructor(axes: readonly AxisSetup[], leg: Leg, startedMs: number) {
    this.#axes = axes.filter((axis) => leg.toDeg[axis.name] !== undefined);
    this.#leg = leg;
    this.#startedMs = startedMs;
    this.#progressMs = startedMs;
    this.#progressAt = leg.fromDeg;
  }

  /** No move that makes progress takes longer, not even at the slowest override. */
  get limitMs(): number {
    return this.#leg.plannedMs * slowestOverride * 1.5 + graceMs;
  }

  /** No move can be over by `nowMs`. */
  endedTooSoon(nowMs: number): boolean {
    return nowMs - this.#startedMs < this.#leg.plannedMs * quickestShare - idleMs / 2;
  }

  judge(placed: Placed): LegVerdict {
    const { report, monotonicMs: nowMs } = placed;
    if (report.state === 'Alarm') return fault('POSITIONER_ALARM', placed, 'the controller is in alarm');
    if (isHeld(report)) return fault('POSITIONER_HELD', placed, `held at the machine (${report.stateText})`);
    if (report.state === 'Sleep' || report.state === 'Check')
      return fault('POSITIONER_HELD', placed, `the controller went to ${report.stateText}`);
    const stray = this.#strayAxis(placed.position);
    this.#strays = stray ? this.#strays + 1 : 0;
    if (stray && this.#strays >= strayReports)
      return fault('POSITIONER_WRONG_PLACE', placed, `${stray.name} left the path of its move`);
    this.#noteProgress(placed);
    if (report.state === 'Idle') {
      this.#idleSinceMs ??= nowMs;
      return nowMs - this.#idleSinceMs >= idleMs ? { kind: 'answer lost' } : underWay;
    }
    this.#idleSinceMs = undefined;
    if (nowMs - this.#progressMs >= stallMs)
      return fault('POSITIONER_STALLED', placed, `no progress for ${stallMs} ms`);
    if (nowMs - this.#startedMs > this.limitMs)
      return fault('POSITIONER_STALLED', placed, 'the move takes far longer than it can');
    return underWay;
  }

  #noteProgress(placed: Placed): void {
    const moved = this.#axes.some(
      (axis) => placed.position[axis.name] !== (this.#progressAt[axis.name] ?? Number.NaN),
    );
    if (!moved) return;
    this.#progressAt = placed.position;
    this.#progressMs = placed.monotonicMs;
  }

  /** An axis outside the stretch between where it started and where it goes. */
  #strayAxis(position: Position): AxisSetup | undefined {
    return this.#axes.find((axis) => {
      const fromDeg = this.#leg.fromDeg[axis.name] ?? Number.NaN;
      const toDeg = this.#leg.toDeg[axis.name] ?? Number.NaN;
      const atDeg = position[axis.name] ?? Number.NaN;
      const slackDeg = Math.max(axis.toleranceDeg, 0.05);
      return atDeg < Math.min(fromDeg, toDeg) - slackDeg || atDeg > Math.max(fromDeg, toDeg) + slackDeg;
    });
  }
}

function fault(code: DriverError['code'], placed: Placed, what: string): LegVerdict {
  const facts = { state: placed.report.stateText, ...placed.position };
  return { kind: 'fault', error: new DriverError(code, what, facts) };
}
