// The physics of the simulated range: what an analyzer at the two antennas would measure, for any pose and
// moment. Knows nothing of instruments and controllers; `truth.ts` tells what the figures really are.
import { type RandomStream, stream } from '../random.ts';
import { type MountedAntenna, mountAntenna } from './antenna-library.ts';
import { type Complex, multiply, speedOfLightMPerS } from './complex.ts';
import { Drift } from './drift.ts';
import { type Path, pathsOf } from './paths.ts';
import type { Pose, PoseAt } from './pose.ts';
import { type CompleteScene, completeScene, type SceneDescription } from './scene-description.ts';
import { Transmission } from './transmission.ts';

export type SParameterName = 'S11' | 'S21' | 'S12' | 'S22';

/** One pass of the analyzer over its grid, as the scene needs to know it. */
export interface ScenePass {
  parameters: readonly SParameterName[];
  /** Ascending; hand in the same array for the same grid: what is worked out for it is kept by identity. */
  frequenciesHz: Float64Array;
  /** Moment of the clock at which point i is measured. */
  pointMs: (index: number) => number;
  poseAt: PoseAt;
  ifBandwidthHz: number;
  averages: number;
  powerDbm: number;
  sourceOn: boolean;
  /** False: the cable's constants are in the data. */
  corrected: boolean;
}

/** What stands on the AUT's mast. */
export type Mounted = 'aut' | 'reference';

interface Grid {
  transmission: Transmission;
  autReflection: Float64Array;
  rangeReflection: Float64Array;
  /** One way through the cable. */
  cable: Float64Array;
}

export class Scene {
  readonly description: CompleteScene;
  readonly antennas: Readonly<Record<Mounted | 'range', MountedAntenna>>;
  readonly #paths: readonly Path[];
  readonly #drift: Drift;
  readonly #noise: RandomStream;
  readonly #startMs: number;
  readonly #grids: Record<Mounted, WeakMap<Float64Array, Grid>> = {
    aut: new WeakMap(),
    reference: new WeakMap(),
  };
  readonly #singles = new Map<number, Float64Array>();
  #transmissionNoise: number | undefined;
  #mounted: Mounted = 'aut';

  /** `startMs`: the moment of the clock at which drift is zero. Throws SceneError. */
  constructor(description: SceneDescription = {}, startMs = 0) {
    this.description = completeScene(description);
    const { aut, reference, range } = this.description.antennas;
    this.antennas = {
      aut: mountAntenna(aut),
      reference: mountAntenna(reference),
      range: mountAntenna(range),
    };
    this.#paths = pathsOf(this.description);
    this.#drift = new Drift(this.description.drift, this.description.seed);
    this.#noise = stream(this.description.seed, 'analyzer-noise');
    this.#startMs = startMs;
  }

  get mounted(): Mounted {
    return this.#mounted;
  }

  /** Swaps what stands on the mast, on the same cable and at the same point. */
  mount(what: Mounted): void {
    this.#mounted = what;
  }

  /** One S-parameter at the calibrated plane, without noise. */
  s(parameter: SParameterName, frequencyHz: number, monotonicMs: number, pose: Pose): Complex {
    let one = this.#singles.get(frequencyHz);
    if (!one) {
      if (this.#singles.size >= 1024) this.#singles.clear();
      one = Float64Array.of(frequencyHz);
      this.#singles.set(frequencyHz, one);
    }
    const grid = this.#grid(one);
    if (parameter === 'S11' || parameter === 'S22') {
      const from = this.#isAutPort(parameter) ? grid.autReflection : grid.rangeReflection;
      return { re: from[0]!, im: from[1]! };
    }
    const out = new Float64Array(2);
    grid.transmission.pointInto(out, 0, pose);
    return multiply({ re: out[0]!, im: out[1]! }, this.#driftFactor(monotonicMs));
  }

  /** One pass with noise: a trace (re, im, …; 2N long) for each parameter. */
  sweep(pass: ScenePass): Map<SParameterName, Float64Array> {
    const traces = new Map<SParameterName, Float64Array>();
    const grid = this.#grid(pass.frequenciesHz);
    let transmission: Float64Array | undefined;
    for (const parameter of pass.parameters) {
      const out = new Float64Array(2 * pass.frequenciesHz.length);
      traces.set(parameter, out);
      if (!pass.sourceOn) {
        this.#fillWithSilence(out);
      } else if (parameter === 'S21' || parameter === 'S12') {
        transmission ??= this.#transmissionTrace(grid, pass);
        out.set(transmission);
        this.#addNoise(out, this.#transmissionDeviation() * this.#noiseScale(pass));
      } else {
        const ofAut = this.#isAutPort(parameter);
        out.set(ofAut ? grid.autReflection : grid.rangeReflection);
        if (ofAut && !pass.corrected) for (let way = 0; way < 2; way++) multiplyInto(out, grid.cable);
        this.#addNoise(out, 10 ** (-this.description.noise.reflectionSnrDb / 20) * this.#noiseScale(pass));
      }
    }
    return traces;
  }

  /** Standard deviation of a noisy transmission reading (of the complex value) at the settings of a pass. */
  transmissionDeviation(pass: Pick<ScenePass, 'ifBandwidthHz' | 'averages' | 'powerDbm'>): number {
    return this.#transmissionDeviation() * this.#noiseScale(pass);
  }

  #transmissionTrace(grid: Grid, pass: ScenePass): Float64Array {
    const points = pass.frequenciesHz.length;
    const out = new Float64Array(2 * points);
    const first = pass.poseAt(pass.pointMs(0));
    const poses: Pose[] = [first];
    let moves = false;
    for (let i = 1; i < points; i++) {
      const pose = pass.poseAt(pass.pointMs(i));
      moves ||= !samePose(first, pose);
      poses.push(pose);
    }
    if (moves) for (let i = 0; i < points; i++) grid.transmission.pointInto(out, i, poses[i]!);
    else grid.transmission.into(out, first);
    if (!pass.corrected) multiplyInto(out, grid.cable);
    for (let i = 0; i < points; i++) {
      const drift = this.#driftFactor(pass.pointMs(i));
      const re = out[2 * i]! * drift.re - out[2 * i + 1]! * drift.im;
      out[2 * i + 1] = out[2 * i]! * drift.im + out[2 * i + 1]! * drift.re;
      out[2 * i] = re;
    }
    return out;
  }

  #driftFactor(monotonicMs: number): Complex {
    const sinceStartMs = monotonicMs - this.#startMs;
    const amplitude = 10 ** (this.#drift.levelDb(sinceStartMs) / 20);
    const phase = (this.#drift.phaseDeg(sinceStartMs) * Math.PI) / 180;
    return { re: amplitude * Math.cos(phase), im: amplitude * Math.sin(phase) };
  }

  #isAutPort(parameter: 'S11' | 'S22'): boolean {
    return (parameter === 'S11') === (this.description.autPort === 1);
  }

  /** Amplitude of the noise at these settings re 1 kHz, one average, 0 dBm. */
  #noiseScale({
    ifBandwidthHz,
    averages,
    powerDbm,
  }: Pick<ScenePass, 'ifBandwidthHz' | 'averages' | 'powerDbm'>) {
    return Math.sqrt(ifBandwidthHz / 1000 / averages) * 10 ** (-powerDbm / 20);
  }

  /** Free space, AUT mounted, axes at 0: the signal that the description's ratio speaks of. */
  #transmissionDeviation(): number {
    if (this.#transmissionNoise === undefined) {
      const { noise, stacking } = this.description;
      const { aut, range } = this.antennas;
      const frequency = Float64Array.of(noise.atHz);
      const direct = this.#paths.slice(0, 1);
      const out = new Float64Array(2);
      const still = { azimuthDeg: 0, elevationDeg: 0, rollDeg: 0 };
      new Transmission(frequency, aut, range, direct, stacking).into(out, still);
      this.#transmissionNoise = Math.hypot(out[0]!, out[1]!) * 10 ** (-noise.snrDb / 20);
    }
    return this.#transmissionNoise;
  }

  #addNoise(out: Float64Array, deviation: number): void {
    if (deviation === 0) return;
    const each = deviation * Math.SQRT1_2;
    for (let i = 0; i < out.length; i++) out[i]! += this.#noise.normal(0, each);
  }

  /** Source off: the receivers divide noise by noise, which tells nothing and is of the order of 1. */
  #fillWithSilence(out: Float64Array): void {
    for (let i = 0; i < out.length; i += 2) {
      const [a, b, c, d] = [
        this.#noise.normal(),
        this.#noise.normal(),
        this.#noise.normal(),
        this.#noise.normal(),
      ];
      const power = c * c + d * d;
      out[i] = (a * c + b * d) / power;
      out[i + 1] = (b * c - a * d) / power;
    }
  }

  #grid(frequenciesHz: Float64Array): Grid {
    const known = this.#grids[this.#mounted].get(frequenciesHz);
    if (known) return known;
    const aut = this.antennas[this.#mounted];
    const range = this.antennas.range;
    const grid: Grid = {
      transmission: new Transmission(frequenciesHz, aut, range, this.#paths, this.description.stacking),
      autReflection: interleave(frequenciesHz, (f) => aut.antenna.reflection(f)),
      rangeReflection: interleave(frequenciesHz, (f) => range.antenna.reflection(f)),
      cable: interleave(frequenciesHz, (f) => this.#cableAt(f)),
    };
    this.#grids[this.#mounted].set(frequenciesHz, grid);
    return grid;
  }

  #cableAt(frequencyHz: number): Complex {
    const { lossDb, electricalLengthM } = this.description.cable;
    const amplitude = 10 ** (-lossDb / 20);
    const phase = (-2 * Math.PI * frequencyHz * electricalLengthM) / speedOfLightMPerS;
    return { re: amplitude * Math.cos(phase), im: amplitude * Math.sin(phase) };
  }
}

function samePose(a: Pose, b: Pose): boolean {
  return a.azimuthDeg === b.azimuthDeg && a.elevationDeg === b.elevationDeg && a.rollDeg === b.rollDeg;
}

function interleave(frequenciesHz: Float64Array, at: (frequencyHz: number) => Complex): Float64Array {
  const out = new Float64Array(2 * frequenciesHz.length);
  frequenciesHz.forEach((frequencyHz, i) => {
    const { re, im } = at(frequencyHz);
    out[2 * i] = re;
    out[2 * i + 1] = im;
  });
  return out;
}

function multiplyInto(out: Float64Array, by: Float64Array): void {
  for (let i = 0; i < out.length; i += 2) {
    const re = out[i]! * by[i]! - out[i + 1]! * by[i + 1]!;
    out[i + 1] = out[i]! * by[i + 1]! + out[i + 1]! * by[i]!;
    out[i] = re;
  }
}
