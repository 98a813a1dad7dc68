// What the simulated bench and its faults ask of a controller, whichever family it speaks.
import type { Observable } from 'rxjs';
import type { Link } from '../../drivers/link/link.ts';
import type { Pose } from '../scene/pose.ts';
import type { ControllerState } from './line-runner.ts';
import type { AxisLetter } from './traits.ts';

export interface SimulatedController {
  connect: (visitor: Link) => void;
  /** Counts every answer given, lost ones included. */
  readonly answered$: Observable<number>;
  readonly state: ControllerState;
  /** Coordinates as the controller believes them, at any instant of the clock. */
  positionAt: (monotonicMs: number) => number[];
  /** Where the shafts truly stand, at any instant of the clock. */
  poseAt: (monotonicMs: number) => Pose;
  shaftAt: (monotonicMs: number) => number[];
  restart: () => void;
  dropVisitors: () => Promise<void>;
  pressHold: () => void;
  loseSteps: (axis: AxisLetter, units: number) => void;
  stall: (axis: AxisLetter, stalled: boolean) => void;
  raiseAlarm: (number: number) => void;
  loseAnswers: (count: number) => void;
  delayAnswers: (count: number, ms: number) => void;
  damageReports: (count: number, damage: (text: string) => string) => void;
}
