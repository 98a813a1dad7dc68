// Wire antennas from computed cuts (data/*.json). The interpolation written here IS the antenna: the truth
// is read from it, so no figure depends on how well it follows the real wires (the tests say how well).
//
// In angle: each cut is a Fourier series of `harmonics` terms (the cuts hold no more: what is left is the
// rounding of the printed gains). In frequency: cubic between the computed frequencies, taken after the
// phase on boresight is turned away, which is interpolated by itself; beyond the ends the end value holds.
// Off both cuts: wires standing along a boom depend on the angle to the boom, times the factor of one wire;
// what the elevation cut tells beyond that is added, fading from the front half to the back half:
//
//   field(az, el) = h(el)·A(ψ) + front·(E(el) − h(el)·A(|el|)) + back·(−E(180−el) − h(el)·A(180−|el|))
//   cos ψ = cos az·cos el,  front = (1 + cos az)/2,  back = 1 − front
import { halfWaveFactor } from './analytic-antennas.ts';
import type { Antenna, AntennaOnGrid } from './antenna.ts';
import { type Complex, multiply } from './complex.ts';
import { cubicWeights, unwrapDegrees } from './interpolation.ts';

export interface WireAntennaData {
  frequenciesHz: readonly number[];
  azimuth: readonly { gainDbi: readonly number[]; phaseDeg: readonly number[] }[];
  elevation: readonly { gainDbi: readonly number[]; phaseDeg: readonly number[] }[];
  impedance: {
    frequenciesHz: readonly number[];
    resistanceOhm: readonly number[];
    reactanceOhm: readonly number[];
  };
  floorDbi: number;
}

const harmonics = 18;
const terms = 2 * harmonics + 1;
const portOhm = 50;

/** Fourier coefficients of both cuts at one frequency, order −harmonics … +harmonics, interleaved. */
interface CutSeries {
  azimuth: Float64Array;
  elevation: Float64Array;
}

export class NecAntenna implements Antenna {
  readonly name: string;
  readonly polarization = 'theta';
  readonly crossRatio: Complex;
  readonly #data: WireAntennaData;
  readonly #knots: readonly CutSeries[];
  readonly #boresightPhasesDeg: readonly number[];

  constructor(name: string, data: WireAntennaData, crossRatio: Complex = { re: 0, im: 0 }) {
    this.name = name;
    this.crossRatio = crossRatio;
    this.#data = data;
    this.#boresightPhasesDeg = unwrapDegrees(data.azimuth.map((cut) => cut.phaseDeg[0]!));
    this.#knots = knotsOf(data, this.#boresightPhasesDeg);
  }

  complexGain(frequencyHz: number, azimuthDeg: number, elevationDeg: number) {
    const out = new Float64Array(2);
    this.onGrid(Float64Array.of(frequencyHz)).fieldAt(out, 0, azimuthDeg, elevationDeg);
    const co = { re: out[0]!, im: out[1]! };
    return { co, cross: multiply(co, this.crossRatio) };
  }

  /** Resistance and reactance are interpolated, then turned into Γ re 50 Ω. */
  reflection(frequencyHz: number): Complex {
    const { frequenciesHz, resistanceOhm, reactanceOhm } = this.#data.impedance;
    const { first, weights } = cubicWeights(frequenciesHz, frequencyHz);
    let r = 0;
    let x = 0;
    for (let j = 0; j < 4; j++) {
      r += weights[j]! * resistanceOhm[first + j]!;
      x += weights[j]! * reactanceOhm[first + j]!;
    }
    const scale = 1 / ((r + portOhm) ** 2 + x * x);
    return { re: (r * r + x * x - portOhm * portOhm) * scale, im: 2 * portOhm * x * scale };
  }

  onGrid(frequenciesHz: Float64Array): AntennaOnGrid {
    return new NecOnGrid(frequenciesHz, this.#data.frequenciesHz, this.#knots, this.#boresightPhasesDeg);
  }
}

class NecOnGrid implements AntennaOnGrid {
  readonly #knots: readonly CutSeries[];
  readonly #first: Uint16Array;
  readonly #weights: Float64Array;
  readonly #phasor: Float64Array;
  readonly #single: (CutSeries | undefined)[];
  readonly #knotFields: Float64Array;

  constructor(
    frequenciesHz: Float64Array,
    knotsHz: readonly number[],
    knots: readonly CutSeries[],
    boresightPhasesDeg: readonly number[],
  ) {
    const n = frequenciesHz.length;
    this.#knots = knots;
    this.#first = new Uint16Array(n);
    this.#weights = new Float64Array(4 * n);
    this.#phasor = new Float64Array(2 * n);
    this.#single = new Array(n);
    this.#knotFields = new Float64Array(2 * knots.length);
    for (let i = 0; i < n; i++) {
      const { first, weights } = cubicWeights(knotsHz, frequenciesHz[i]!);
      this.#first[i] = first;
      this.#weights.set(weights, 4 * i);
      let phaseDeg = 0;
      for (let j = 0; j < 4; j++) phaseDeg += weights[j]! * boresightPhasesDeg[first + j]!;
      this.#phasor[2 * i] = Math.cos((phaseDeg * Math.PI) / 180);
      this.#phasor[2 * i + 1] = Math.sin((phaseDeg * Math.PI) / 180);
    }
  }

  fieldInto(out: Float64Array, azimuthDeg: number, elevationDeg: number): void {
    const fields = this.#knotFields;
    for (let k = 0; k < this.#knots.length; k++) {
      fieldOf(this.#knots[k]!, azimuthDeg, elevationDeg, fields, 2 * k);
    }
    for (let i = 0; i < this.#first.length; i++) {
      let re = 0;
      let im = 0;
      const at = 2 * this.#first[i]!;
      for (let j = 0; j < 4; j++) {
        const weight = this.#weights[4 * i + j]!;
        re += weight * fields[at + 2 * j]!;
        im += weight * fields[at + 2 * j + 1]!;
      }
      this.#turnAndKeep(out, i, re, im);
    }
  }

  fieldAt(out: Float64Array, index: number, azimuthDeg: number, elevationDeg: number): void {
    this.#single[index] ??= this.#seriesAt(index);
    fieldOf(this.#single[index]!, azimuthDeg, elevationDeg, out, 2 * index);
    this.#turnAndKeep(out, index, out[2 * index]!, out[2 * index + 1]!);
  }

  #turnAndKeep(out: Float64Array, index: number, re: number, im: number): void {
    const c = this.#phasor[2 * index]!;
    const s = this.#phasor[2 * index + 1]!;
    out[2 * index] = re * c - im * s;
    out[2 * index + 1] = re * s + im * c;
  }

  /** The series at one frequency of the grid: interpolating coefficients or fields is the same sum. */
  #seriesAt(index: number): CutSeries {
    const azimuth = new Float64Array(2 * terms);
    const elevation = new Float64Array(2 * terms);
    for (let j = 0; j < 4; j++) {
      const knot = this.#knots[this.#first[index]! + j]!;
      const weight = this.#weights[4 * index + j]!;
      for (let t = 0; t < 2 * terms; t++) {
        azimuth[t]! += weight * knot.azimuth[t]!;
        elevation[t]! += weight * knot.elevation[t]!;
      }
    }
    return { azimuth, elevation };
  }
}

/** Worked out once per set of cuts: nights build many scenes of the same antennas. */
const knownKnots = new WeakMap<WireAntennaData['azimuth'], readonly CutSeries[]>();

function knotsOf(data: WireAntennaData, boresightPhasesDeg: readonly number[]): readonly CutSeries[] {
  let knots = knownKnots.get(data.azimuth);
  if (!knots) {
    knots = data.azimuth.map((azimuth, k) => ({
      azimuth: seriesOf(azimuth, boresightPhasesDeg[k]!, data.floorDbi),
      elevation: seriesOf(data.elevation[k]!, boresightPhasesDeg[k]!, data.floorDbi),
    }));
    knownKnots.set(data.azimuth, knots);
  }
  return knots;
}

/** Discrete Fourier transform of a 1° cut, kept to ±harmonics, boresight phase taken out. */
function seriesOf(
  cut: { gainDbi: readonly number[]; phaseDeg: readonly number[] },
  boresightPhaseDeg: number,
  floorDbi: number,
): Float64Array {
  const n = cut.gainDbi.length;
  const out = new Float64Array(2 * terms);
  for (let m = 0; m < n; m++) {
    const gainDbi = cut.gainDbi[m]!;
    if (gainDbi <= floorDbi) continue;
    const amplitude = 10 ** (gainDbi / 20) / n;
    const phase = ((cut.phaseDeg[m]! - boresightPhaseDeg) * Math.PI) / 180;
    for (let t = 0; t < terms; t++) {
      const angle = phase - (2 * Math.PI * m * (t - harmonics)) / n;
      out[2 * t]! += amplitude * Math.cos(angle);
      out[2 * t + 1]! += amplitude * Math.sin(angle);
    }
  }
  return out;
}

let sumRe = 0;
let sumIm = 0;

/** Sums a series at an angle in radians, into sumRe and sumIm (no allocation in the inner loop). */
function sumSeries(series: Float64Array, angle: number): void {
  const stepRe = Math.cos(angle);
  const stepIm = Math.sin(angle);
  let re = series[2 * harmonics]!;
  let im = series[2 * harmonics + 1]!;
  let turnRe = 1;
  let turnIm = 0;
  for (let h = 1; h <= harmonics; h++) {
    const nextRe = turnRe * stepRe - turnIm * stepIm;
    turnIm = turnRe * stepIm + turnIm * stepRe;
    turnRe = nextRe;
    const up = 2 * (harmonics + h);
    const down = 2 * (harmonics - h);
    re += (series[up]! + series[down]!) * turnRe - (series[up + 1]! - series[down + 1]!) * turnIm;
    im += (series[up + 1]! + series[down + 1]!) * turnRe + (series[up]! - series[down]!) * turnIm;
  }
  sumRe = re;
  sumIm = im;
}

/** The formula of the file head; small differences of the two cuts where they meet go to the elevation cut. */
function fieldOf(cuts: CutSeries, azimuthDeg: number, elevationDeg: number, out: Float64Array, at: number) {
  const az = (azimuthDeg * Math.PI) / 180;
  if (elevationDeg === 0) {
    sumSeries(cuts.azimuth, az);
    out[at] = sumRe;
    out[at + 1] = sumIm;
    return;
  }
  const el = (elevationDeg * Math.PI) / 180;
  const factor = halfWaveFactor(el);
  const front = (1 + Math.cos(az)) / 2;
  let re = 0;
  let im = 0;
  const add = (series: Float64Array, angle: number, weight: number): void => {
    if (weight === 0) return;
    sumSeries(series, angle);
    re += weight * sumRe;
    im += weight * sumIm;
  };
  add(cuts.azimuth, Math.acos(Math.max(-1, Math.min(1, Math.cos(az) * Math.cos(el)))), factor);
  const half = (
    weight: number,
    sign: number,
    elevationAngle: number,
    azimuthAngle: number,
    meeting: number,
  ) => {
    add(cuts.elevation, elevationAngle, sign * weight);
    add(cuts.azimuth, azimuthAngle, -factor * weight);
    add(cuts.elevation, meeting, -sign * factor * weight);
    add(cuts.azimuth, meeting, factor * weight);
  };
  half(front, 1, el, Math.abs(el), 0);
  half(1 - front, -1, Math.PI - el, Math.PI - Math.abs(el), Math.PI);
  out[at] = re;
  out[at + 1] = im;
}
