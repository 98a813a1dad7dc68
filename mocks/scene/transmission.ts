// Transmission between the range antenna and one mounted antenna over one grid of frequencies: all that
// does not depend on pose and time is worked out once, because a night asks for thousands of sweeps.
import type { AntennaOnGrid } from './antenna.ts';
import type { MountedAntenna } from './antenna-library.ts';
import { speedOfLightMPerS, squaredMagnitude } from './complex.ts';
import {
  after,
  directionOf,
  dot,
  mountTurn,
  rollTurn,
  type Stacking,
  tangentsAt,
  turn,
  type Vector,
} from './orientation.ts';
import type { Path } from './paths.ts';
import type { Pose } from './pose.ts';

/** What the wave of one path meets at the AUT in one pose. */
interface Meeting {
  azimuthDeg: number;
  elevationDeg: number;
  /** Share of a vertical and of a horizontal wave that the AUT takes up, complex by its cross component. */
  vertical: readonly [number, number];
  horizontal: readonly [number, number];
}

/** Power lost at a reflecting port, as an amplitude factor: √(1 − |Γ|²). */
function matchFactor(mounted: MountedAntenna, frequencyHz: number): number {
  return Math.sqrt(1 - squaredMagnitude(mounted.antenna.reflection(frequencyHz))) * mounted.lossFactor;
}

export class Transmission {
  readonly #aut: MountedAntenna;
  readonly #autOnGrid: AntennaOnGrid;
  readonly #range: MountedAntenna;
  readonly #rangeOnGrid: AntennaOnGrid;
  readonly #paths: readonly Path[];
  readonly #stacking: Stacking;
  readonly #points: number;
  /** Per path: (λ/4πR)·amplitude·delay·match of both ends, then the same times the range antenna's field. */
  readonly #propagation: readonly Float64Array[];
  #launched: readonly Float64Array[] = [];
  #launchedRollDeg: number | undefined;
  readonly #field: Float64Array;

  constructor(
    frequenciesHz: Float64Array,
    aut: MountedAntenna,
    range: MountedAntenna,
    paths: readonly Path[],
    stacking: Stacking,
  ) {
    this.#aut = aut;
    this.#range = range;
    this.#paths = paths;
    this.#stacking = stacking;
    this.#points = frequenciesHz.length;
    this.#autOnGrid = aut.antenna.onGrid(frequenciesHz);
    this.#rangeOnGrid = range.antenna.onGrid(frequenciesHz);
    this.#field = new Float64Array(2 * this.#points);
    const directM = paths[0]!.lengthM;
    const ends = Float64Array.from(frequenciesHz, (f) => matchFactor(aut, f) * matchFactor(range, f));
    this.#propagation = paths.map(({ lengthM, amplitude }) => {
      const out = new Float64Array(2 * frequenciesHz.length);
      frequenciesHz.forEach((frequencyHz, i) => {
        const wavelengthM = speedOfLightMPerS / frequencyHz;
        const scale = (ends[i]! * wavelengthM) / (4 * Math.PI * directM);
        const phase = (-2 * Math.PI * lengthM) / wavelengthM;
        const c = scale * Math.cos(phase);
        const s = scale * Math.sin(phase);
        out[2 * i] = amplitude.re * c - amplitude.im * s;
        out[2 * i + 1] = amplitude.re * s + amplitude.im * c;
      });
      return out;
    });
  }

  /** Writes the transmission at all frequencies for one pose. */
  into(out: Float64Array, pose: Pose): void {
    this.#launch(pose.rollDeg);
    out.fill(0);
    this.#paths.forEach((path, p) => {
      const { azimuthDeg, elevationDeg, factor } = this.#meet(path, pose);
      this.#autOnGrid.fieldInto(this.#field, azimuthDeg, elevationDeg);
      for (let i = 0; i < this.#points; i++) this.#addPoint(out, i, this.#launched[p]!, factor);
    });
  }

  /** Writes the transmission at one frequency, at its place in `out`. */
  pointInto(out: Float64Array, index: number, pose: Pose): void {
    this.#launch(pose.rollDeg);
    out[2 * index] = 0;
    out[2 * index + 1] = 0;
    this.#paths.forEach((path, p) => {
      const { azimuthDeg, elevationDeg, factor } = this.#meet(path, pose);
      this.#autOnGrid.fieldAt(this.#field, index, azimuthDeg, elevationDeg);
      this.#addPoint(out, index, this.#launched[p]!, factor);
    });
  }

  #addPoint(out: Float64Array, i: number, launched: Float64Array, factor: readonly [number, number]): void {
    const fieldRe = this.#field[2 * i]! * factor[0] - this.#field[2 * i + 1]! * factor[1];
    const fieldIm = this.#field[2 * i]! * factor[1] + this.#field[2 * i + 1]! * factor[0];
    out[2 * i]! += fieldRe * launched[2 * i]! - fieldIm * launched[2 * i + 1]!;
    out[2 * i + 1]! += fieldRe * launched[2 * i + 1]! + fieldIm * launched[2 * i]!;
  }

  /** The range antenna's field along each path at this roll, times the propagation; kept while roll rests. */
  #launch(rollDeg: number): void {
    if (rollDeg === this.#launchedRollDeg) return;
    // The antenna looks back at the AUT: what rolls to the left there rolls to its own right.
    const toAntenna = after(this.#range.squint, rollTurn(rollDeg));
    this.#launched = this.#paths.map((path, p) => {
      const { azimuthDeg, elevationDeg } = directionOf(turn(toAntenna, path.departure));
      const field = new Float64Array(2 * this.#points);
      this.#rangeOnGrid.fieldInto(field, azimuthDeg, elevationDeg);
      const propagation = this.#propagation[p]!;
      for (let i = 0; i < this.#points; i++) {
        const re = field[2 * i]! * propagation[2 * i]! - field[2 * i + 1]! * propagation[2 * i + 1]!;
        const im = field[2 * i]! * propagation[2 * i + 1]! + field[2 * i + 1]! * propagation[2 * i]!;
        field[2 * i] = re;
        field[2 * i + 1] = im;
      }
      return field;
    });
    this.#launchedRollDeg = rollDeg;
  }

  #meet(path: Path, pose: Pose): { azimuthDeg: number; elevationDeg: number; factor: [number, number] } {
    const { vertical, horizontal, ...direction } = meet(path, pose, this.#aut, this.#stacking);
    // The range antenna's own vertical, rolled towards the left, with its cross component across it.
    const { re, im } = this.#range.antenna.crossRatio;
    const [s, c] = [Math.sin((pose.rollDeg * Math.PI) / 180), Math.cos((pose.rollDeg * Math.PI) / 180)];
    const up: [number, number] = [c - s * re, -s * im];
    const left: [number, number] = [s + c * re, c * im];
    return {
      ...direction,
      factor: [
        up[0] * vertical[0] - up[1] * vertical[1] + left[0] * horizontal[0] - left[1] * horizontal[1],
        up[0] * vertical[1] + up[1] * vertical[0] + left[0] * horizontal[1] + left[1] * horizontal[0],
      ],
    };
  }
}

/** Where a path's wave meets the AUT in a pose, and how its polarization fits. */
export function meet(
  path: Pick<Path, 'arrival' | 'vertical' | 'horizontal'>,
  pose: Pose,
  { antenna, squint }: MountedAntenna,
  stacking: Stacking,
): Meeting {
  const toAntenna = after(squint, mountTurn(pose, stacking));
  const direction = turn(toAntenna, path.arrival);
  const { re, im } = antenna.crossRatio;
  if (antenna.polarization === 'matched') {
    return { ...directionOf(direction), vertical: [1, 0], horizontal: [re, im] };
  }
  const { azimuth, elevation } = tangentsAt(direction);
  const share = (wave: Vector): [number, number] => {
    const turned = turn(toAntenna, wave);
    const [co, cross] = [dot(turned, elevation), dot(turned, azimuth)];
    return [co + cross * re, cross * im];
  };
  return { ...directionOf(direction), vertical: share(path.vertical), horizontal: share(path.horizontal) };
}
