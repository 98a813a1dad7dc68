// What the scene asks of an antenna: complex gain by direction and frequency, and reflection. The amplitude
// is that of IEEE gain (mismatch left out); phase referred to the rotation axis, time factor exp(+jwt).
import type { Complex } from './complex.ts';

/**
 * Which way the field of the co component points. `theta`: along growing elevation, as a vertical wire
 * radiates; the received level then follows the angle between that and the wave. `matched`: always along the
 * antenna's own vertical, an idealization that keeps the declared pattern at every pose.
 */
export type Polarization = 'theta' | 'matched';

export interface Antenna {
  readonly name: string;
  readonly polarization: Polarization;
  /** Cross component over co component, the same in every direction. */
  readonly crossRatio: Complex;
  /** |co|² is the IEEE gain as a ratio; azimuth and elevation in degrees in the antenna's frame. */
  complexGain(frequencyHz: number, azimuthDeg: number, elevationDeg: number): { co: Complex; cross: Complex };
  /** Γ re 50 Ω. */
  reflection(frequencyHz: number): Complex;
  /** The same gain over a grid of frequencies, with all that does not depend on direction worked out. */
  onGrid(frequenciesHz: Float64Array): AntennaOnGrid;
}

/** Amplitudes of the co component, interleaved (re, im), 2N long. */
export interface AntennaOnGrid {
  /** Writes the amplitudes at every frequency towards one direction. */
  fieldInto(out: Float64Array, azimuthDeg: number, elevationDeg: number): void;
  /** Writes the amplitude at one frequency alone, at its place in `out`. */
  fieldAt(out: Float64Array, index: number, azimuthDeg: number, elevationDeg: number): void;
}
