// What a positioner does for a run. Degrees everywhere; a position is the axis's own coordinate, not yet
// a pattern angle. Nothing here knows of G-code. The positioner holds the first safety invariant: no
// motion command leaves it for a position outside an axis's travel.
import type { Observable } from 'rxjs';

export type AxisName = string;

/** Coordinates in degrees, by axis. */
export type Position = Readonly<Record<AxisName, number>>;

export interface AxisSetup {
  name: AxisName;
  /** The controller's letter for this axis. */
  word: string;
  /** Controller units (its "mm") per degree; 1 where the controller counts degrees. Negative turns the sense. */
  unitsPerDegree: number;
  /** Travel including the cable-wrap range: no position outside is ever commanded. */
  travelMinDeg: number;
  travelMaxDeg: number;
  rateDegPerS: number;
  accelerationDegPerS2: number;
  /** The last stretch before every stop comes from this side, so that backlash cancels. */
  approachFrom: 'below' | 'above';
  /** Length of that last stretch; 0 switches it off. */
  approachDeg: number;
  /** Wait after arrival for belts and masts to come to rest. */
  settleMs: number;
  /** How far the read-back may be from the target. */
  toleranceDeg: number;
  /** `switch`: found by the controller's homing cycle; `none`: the controller's zero at start is believed. */
  homing: 'switch' | 'none';
}

export interface ControllerIdentity {
  family: string;
  firmware: string;
  options: string;
}

export interface PositionReport {
  monotonicMs: number;
  position: Position;
  moving: boolean;
  /** The controller's own word for its state, for the log and the page. */
  state: string;
}

export interface Arrival {
  /** Fresh read-back after the barrier, in degrees. */
  position: Position;
  /** Clock.monotonicMs() when settled: from here the axes are at rest. */
  settledMonotonicMs: number;
}

export interface StopReport {
  /** Where the axes stand now. */
  position: Position;
  /** From the call to the confirmed halt. */
  haltMs: number;
}

export interface Positioner {
  readonly axes: readonly AxisSetup[];
  /** True while every axis's coordinate can be trusted: cleared by any restart, alarm, reconnect. */
  readonly referenceValid: boolean;
  /**
   * After identify: true when the controller shows that it has not restarted since a driver of ours last spoke
   * to it, so that its count went on unbroken, also through the death of a process. Absent where it cannot tell.
   */
  readonly countUnbroken?: boolean;
  /** Every position report received, moving or not. Hot. */
  readonly position$: Observable<PositionReport>;
  /** Connects, finds out who answers, checks the settings that an unattended run depends on. */
  identify(signal?: AbortSignal): Promise<ControllerIdentity>;
  /** Homes the axes that can; makes the reference valid. */
  home(signal?: AbortSignal): Promise<void>;
  /**
   * Moves the named axes there, the last stretch from the approach side, waits for the barrier, reads the
   * position afresh, waits to settle. Throws POSITIONER_OUTSIDE_TRAVEL before anything is sent.
   * With `{ throughApproach: true }` an axis that already stands at the target leaves it and comes back.
   */
  moveTo(target: Position, options?: { throughApproach?: boolean; signal?: AbortSignal }): Promise<Arrival>;
  /** Decelerates and confirms that nothing moves. Its own way past whatever is waiting. */
  stop(): Promise<StopReport>;
  readPosition(signal?: AbortSignal): Promise<Position>;
  close(): Promise<void>;
}
