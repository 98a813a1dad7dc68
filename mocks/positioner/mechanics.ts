// The stage behind the motors: gear play, home switches, and how controller units become shaft degrees. The
// controller knows nothing of this; the scene sees nothing else.
import type { Pose } from '../scene/pose.ts';
import { type AxisLetter, axisLetters } from './traits.ts';

export interface AxisMechanics {
  /** Gear play in controller units: the shaft lags by this after the direction has turned to negative. */
  playUnits?: number;
  /** Where the shaft stands when the bench is built, in units. */
  startUnits?: number;
  /** Where the home switch closes, in units of the shaft; absent: no switch is fitted. */
  switchUnits?: number;
  /** Controller units per degree of the shaft. */
  unitsPerDegree?: number;
  /** Shaft angle in degrees where the shaft stands at 0 units. */
  zeroDeg?: number;
  /** Steps per unit the drive really has; the controller's own setting may be wrong. */
  stepsPerUnit?: number;
}

export type Mechanics = Partial<Record<AxisLetter, AxisMechanics>>;

export class Stage {
  readonly #axes: readonly AxisMechanics[];

  constructor(axisCount: number, mechanics: Mechanics) {
    this.#axes = axisLetters.slice(0, axisCount).map((letter) => mechanics[letter] ?? {});
  }

  get play(): number[] {
    return this.#axes.map((axis) => axis.playUnits ?? 0);
  }

  get start(): number[] {
    return this.#axes.map((axis) => axis.startUnits ?? 0);
  }

  /** Axes with a home switch, in the order they are homed: last to first, so that masts come down first. */
  get switched(): number[] {
    return this.#axes.flatMap((axis, index) => (axis.switchUnits === undefined ? [] : [index])).reverse();
  }

  /** Motor travel per counter unit when the controller is set to these steps per unit. */
  follow(settings: readonly number[]): number[] {
    return this.#axes.map((axis, index) =>
      axis.stepsPerUnit === undefined ? 1 : settings[index]! / axis.stepsPerUnit,
    );
  }

  /** Whether the switch of an axis is closed by a shaft there; `side` is the direction of the switch's end. */
  isClosed(axis: number, shaft: number, side: 1 | -1): boolean {
    const at = this.#axes[axis]?.switchUnits;
    return at !== undefined && (shaft - at) * side >= -1e-9;
  }

  /** Azimuth from the first axis, elevation from the second, roll from the third. */
  pose(shaft: readonly number[]): Pose {
    const degrees = (index: number): number => {
      const axis = this.#axes[index] ?? {};
      return (shaft[index] ?? 0) / (axis.unitsPerDegree ?? 1) + (axis.zeroDeg ?? 0);
    };
    return { azimuthDeg: degrees(0), elevationDeg: degrees(1), rollDeg: degrees(2) };
  }
}
