// Antennas whose pattern is a formula of the direction: their figures can be had from any handbook. Phase
// is constant; the reflection is a declared constant.
import type { Antenna, AntennaOnGrid, Polarization } from './antenna.ts';
import { type Complex, multiply, speedOfLightMPerS } from './complex.ts';

/** Amplitude re the square root of IEEE gain; `azimuth` and `elevation` in radians. */
type Pattern = (frequencyHz: number, azimuth: number, elevation: number) => number;

export interface ConstantPort {
  reflection: Complex;
  crossRatio: Complex;
}

export class AnalyticAntenna implements Antenna {
  readonly name: string;
  readonly polarization: Polarization;
  readonly crossRatio: Complex;
  readonly #reflection: Complex;
  readonly #pattern: Pattern;

  constructor(name: string, polarization: Polarization, port: ConstantPort, pattern: Pattern) {
    this.name = name;
    this.polarization = polarization;
    this.crossRatio = port.crossRatio;
    this.#reflection = port.reflection;
    this.#pattern = pattern;
  }

  complexGain(frequencyHz: number, azimuthDeg: number, elevationDeg: number) {
    const co = { re: this.#pattern(frequencyHz, radians(azimuthDeg), radians(elevationDeg)), im: 0 };
    return { co, cross: multiply(co, this.crossRatio) };
  }

  reflection(): Complex {
    return this.#reflection;
  }

  onGrid(frequenciesHz: Float64Array): AntennaOnGrid {
    const pattern = this.#pattern;
    const fieldAt = (out: Float64Array, index: number, azimuthDeg: number, elevationDeg: number): void => {
      out[2 * index] = pattern(frequenciesHz[index]!, radians(azimuthDeg), radians(elevationDeg));
      out[2 * index + 1] = 0;
    };
    const fieldInto = (out: Float64Array, azimuthDeg: number, elevationDeg: number): void => {
      for (let i = 0; i < frequenciesHz.length; i++) fieldAt(out, i, azimuthDeg, elevationDeg);
    };
    return { fieldAt, fieldInto };
  }
}

function radians(angleDeg: number): number {
  return (angleDeg * Math.PI) / 180;
}

/** The same gain everywhere. */
export function isotropicPattern(gainDbi: number): Pattern {
  const amplitude = 10 ** (gainDbi / 20);
  return () => amplitude;
}

/** Field (1 + cos t)/2 off boresight, raised so that the level at the back is `frontToBackDb` down. */
export function cardioidPattern(gainDbi: number, frontToBackDb: number): Pattern {
  const amplitude = 10 ** (gainDbi / 20);
  const back = 10 ** (-frontToBackDb / 20);
  return (_frequencyHz, azimuth, elevation) => {
    const cosine = Math.cos(azimuth) * Math.cos(elevation);
    return amplitude * (back + ((1 - back) * (1 + cosine)) / 2);
  };
}

/**
 * Field factor of a thin vertical half-wave wire, cos((π/2) sin e)/cos e; 1 at the horizon, 0 at the poles.
 * Source: any antenna handbook, sinusoidal current on a half-wave dipole.
 */
export function halfWaveFactor(elevation: number): number {
  const cosine = Math.cos(elevation);
  if (Math.abs(cosine) < 1e-9) return 0;
  return Math.cos((Math.PI / 2) * Math.sin(elevation)) / cosine;
}

/** Directivity of the thin half-wave dipole, 4/Cin(2π) = 1.640922 (closed form). */
const halfWaveDirectivity = 1.640922;

export function halfWavePattern(): Pattern {
  const amplitude = Math.sqrt(halfWaveDirectivity);
  return (_frequencyHz, _azimuth, elevation) => amplitude * halfWaveFactor(elevation);
}

/**
 * A horizontal uniform line along y, sin(u)/u with u = π(L/λ)·sin(azimuth)·cos(elevation), no element
 * pattern: front and back alike, unless a screen makes all that lies behind weaker by `frontToBackDb`.
 * `gainDbi` absent: the directivity of the line without a screen, at each frequency.
 */
export function lineSourcePattern(lengthM: number, gainDbi?: number, frontToBackDb = 0): Pattern {
  const behind = 10 ** (-frontToBackDb / 20);
  const fixed = gainDbi === undefined ? undefined : 10 ** (gainDbi / 20);
  const known = new Map<number, number>();
  const peak = (frequencyHz: number): number => {
    if (fixed !== undefined) return fixed;
    let amplitude = known.get(frequencyHz);
    if (amplitude === undefined) {
      amplitude = Math.sqrt(lineDirectivity((lengthM * frequencyHz) / speedOfLightMPerS));
      known.set(frequencyHz, amplitude);
    }
    return amplitude;
  };
  return (frequencyHz, azimuth, elevation) => {
    const lengthWaves = (lengthM * frequencyHz) / speedOfLightMPerS;
    const screen = Math.cos(azimuth) * Math.cos(elevation) < 0 ? behind : 1;
    return screen * peak(frequencyHz) * sinc(Math.PI * lengthWaves * Math.sin(azimuth) * Math.cos(elevation));
  };
}

function sinc(u: number): number {
  return Math.abs(u) < 1e-6 ? 1 - (u * u) / 6 : Math.sin(u) / u;
}

/** One over the mean of sinc²(π L w) for w evenly from −1 to 1 (equal areas of the sphere); Simpson's rule. */
function lineDirectivity(lengthWaves: number): number {
  const steps = 2 * Math.ceil(50 * (1 + lengthWaves));
  let sum = 0;
  for (let i = 0; i <= steps; i++) {
    const weight = i === 0 || i === steps ? 1 : i % 2 === 1 ? 4 : 2;
    sum += weight * sinc((Math.PI * lengthWaves * i) / steps) ** 2;
  }
  return (3 * steps) / sum;
}
