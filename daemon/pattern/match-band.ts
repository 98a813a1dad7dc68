// Match over a band: where the antenna matches best, where it is resonant, how wide it stays usable, and by
// how much its elements are too long. Best match and resonance are two frequencies, not one.
import { absentFigure, boundFigure, type Figure, type FigureValue, valueFigure } from './figure.ts';
import { gammaOfVswr, impedance, returnLossDb, usualImpedanceOhm } from './match.ts';
import { parabolaVertex } from './parabola.ts';
import { PatternError, positive } from './pattern-error.ts';

/** S11 of a band: N frequencies in Hz, ascending, and N complex values, interleaved re, im, length 2N. */
export interface Reflection {
  frequenciesHz: Float64Array;
  s11: Float64Array;
  /** N rms amplitudes of the complex noise of S11, from `meanNoise`, where it is known. */
  noise?: Float64Array;
}

/**
 * Differences within this many standard deviations of the noise are none: among 1601 values of pure noise
 * one lies beyond it in fewer than one band of a hundred thousand.
 */
const noiseDeviations = 6;

export interface BestMatch {
  /** Where |S11| is least, in Hz. */
  frequencyHz: Figure;
  /** Return loss at the best sample, in dB. */
  returnLossDb: Figure;
}

/**
 * Best match of a band: the frequency of least |S11|.
 *
 * The least sample, refined by a parabola in |S11|² through its neighbours (the square is smooth through a
 * perfect match, decibels are not).
 *
 * @param reflection S11 over the band
 * @returns frequency in Hz, an upper or lower bound when the least sample is the band's first or last,
 *   absent when no |S11| differs from the band's mean by more than six standard deviations of its noise; the
 *   return loss of that sample
 * @throws PatternError for frequencies out of order, or numbers that are not finite
 * Source: common practice, no source. Checked: tests/outside (NEC dipole band), tests/unit/daemon/pattern.
 */
export function bestMatch(reflection: Reflection): BestMatch {
  const powers = reflectedPowers(reflection);
  const { frequenciesHz } = reflection;
  const last = powers.length - 1;
  const best = powers.reduce((least, power, k) => (power < powers[least]! ? k : least), 0);
  const loss = returnLossDb(Math.sqrt(powers[best]!), reflection.noise?.[best]);
  if (sameWithinNoise(powers.map(Math.sqrt), reflection.noise)) {
    const because = 'the antenna matches alike over the whole band: what differences there are is noise';
    return { frequencyHz: absentFigure(because), returnLossDb: loss };
  }
  const sampledHz = frequenciesHz[best]!;
  if (best === 0 || best === last) {
    const note = `|S11| still falls at the ${best === 0 ? 'lower' : 'upper'} end of the band`;
    return { frequencyHz: boundFigure(best === 0 ? 'upper' : 'lower', sampledHz, note), returnLossDb: loss };
  }
  const vertex = parabolaVertex(
    frequenciesHz[best - 1]!,
    powers[best - 1]!,
    sampledHz,
    powers[best]!,
    frequenciesHz[best + 1]!,
    powers[best + 1]!,
  );
  return { frequencyHz: valueFigure(vertex?.x ?? sampledHz), returnLossDb: loss };
}

/**
 * Resonance: where the reactance at the calibrated plane is zero.
 *
 * X(f) is linear between samples; of several zeros the one nearest the best match counts.
 *
 * @param reflection S11 over the band
 * @param referenceOhm Z0, 50 Ω unless given
 * @returns frequency in Hz; absent when X keeps its sign over the band (it says which), and when S11 does not
 *   show both signs by more than six standard deviations of its noise
 * @throws PatternError for frequencies out of order, or numbers that are not finite
 * Source: common practice, no source. Checked: tests/outside (NEC dipole band).
 */
export function resonance(reflection: Reflection, referenceOhm = usualImpedanceOhm): Figure {
  const best = bestMatch(reflection).frequencyHz;
  const nearHz = best.kind === 'absent' ? 0 : best.value;
  const { frequenciesHz, s11 } = reflection;
  let found: number | undefined;
  let before: { hz: number; ohm: number } | undefined;
  for (let k = 0; k < frequenciesHz.length; k += 1) {
    const z = impedance(s11[2 * k]!, s11[2 * k + 1]!, referenceOhm);
    const here = z.kind === 'value' ? { hz: frequenciesHz[k]!, ohm: z.reactanceOhm } : undefined;
    const zeroHz = here && zeroBetween(before ?? here, here);
    if (
      zeroHz !== undefined &&
      (found === undefined || Math.abs(zeroHz - nearHz) < Math.abs(found - nearHz))
    ) {
      found = zeroHz;
    }
    before = here;
  }
  const shown = signsShown(reflection);
  if (!shown.inductive && !shown.capacitive) {
    return absentFigure('no resonance to be seen: what reactance there is over the band is noise');
  }
  if (found !== undefined) return shown.inductive && shown.capacitive ? valueFigure(found) : keeps(shown);
  if (!before) return absentFigure('no resonance in the band: an open circuit at its end');
  return keeps({ inductive: before.ohm > 0 });
}

export interface MatchedBand {
  /** Edges in Hz: bounds where the band ends before the limit is passed. */
  startHz: Figure;
  stopHz: Figure;
  /** Width in Hz: a lower bound when one edge is. */
  widthHz: Figure;
}

/**
 * Bandwidth for a VSWR limit: the unbroken band round the best match in which the limit is kept.
 *
 * The edges are linear in |S11| between samples.
 *
 * @param reflection S11 over the band
 * @param vswrLimit largest VSWR that still counts, above 1
 * @returns edges and width in Hz; all absent when the best match exceeds the limit
 * @throws PatternError for a limit of 1 or less, frequencies out of order, or numbers that are not finite
 * Source: common practice, no source. Checked: tests/outside (NEC Yagi sweep), tests/unit/daemon/pattern.
 */
export function matchedBand(reflection: Reflection, vswrLimit: number): MatchedBand {
  const limit = gammaOfVswr(vswrLimit);
  if (limit <= 0) throw new PatternError('A VSWR limit of 1 leaves no band; hand in more.', { vswrLimit });
  const sizes = reflectedPowers(reflection).map(Math.sqrt);
  const best = sizes.reduce((least, size, k) => (size < sizes[least]! ? k : least), 0);
  if (sizes[best]! > limit) {
    const none = absentFigure(`the VSWR is above ${vswrLimit} at every frequency`);
    return { startHz: none, stopHz: none, widthHz: none };
  }
  const startHz = edge(reflection.frequenciesHz, sizes, best, -1, limit);
  const stopHz = edge(reflection.frequenciesHz, sizes, best, 1, limit);
  const width = stopHz.value - startHz.value;
  const open = startHz.kind === 'bound' || stopHz.kind === 'bound';
  return { startHz, stopHz, widthHz: open ? boundFigure('lower', width) : valueFigure(width) };
}

/**
 * Length scale: by which factor to multiply the elements' length to move the resonance to the marker.
 *
 * @param resonanceHz resonance as measured, in Hz
 * @param markerHz frequency the antenna is built for, in Hz
 * @returns f_resonance / f_marker: below 1 shorten, above 1 lengthen
 * @throws PatternError for frequencies that are not above zero
 * Source: common practice. Checked: tests/outside (I-SCALE).
 */
export function lengthScale(resonanceHz: number, markerHz: number): number {
  return positive('resonanceHz', resonanceHz) / positive('markerHz', markerHz);
}

function reflectedPowers({ frequenciesHz, s11, noise }: Reflection): number[] {
  const count = frequenciesHz.length;
  if (count < 1 || s11.length !== 2 * count || (noise && noise.length !== count)) {
    throw new PatternError('Hand in one complex S11 for each frequency.', { count, numbers: s11.length });
  }
  return Array.from(frequenciesHz, (frequencyHz, k) => {
    positive('frequencyHz', frequencyHz);
    if (k > 0 && frequencyHz <= frequenciesHz[k - 1]!) {
      throw new PatternError(`Frequencies are out of order at ${frequencyHz} Hz.`, { frequencyHz, index: k });
    }
    const power = s11[2 * k]! ** 2 + s11[2 * k + 1]! ** 2;
    if (!Number.isFinite(power)) {
      throw new PatternError(`S11 at ${frequencyHz} Hz is no finite number.`, { frequencyHz, index: k });
    }
    return power;
  });
}

function zeroBetween(a: { hz: number; ohm: number }, b: { hz: number; ohm: number }): number | undefined {
  if (b.ohm === 0) return b.hz;
  if (a.ohm === 0 || Math.sign(a.ohm) === Math.sign(b.ohm)) return undefined;
  return a.hz + ((b.hz - a.hz) * a.ohm) / (a.ohm - b.ohm);
}

function edge(
  frequenciesHz: Float64Array,
  sizes: readonly number[],
  best: number,
  step: 1 | -1,
  limit: number,
): FigureValue | Extract<Figure, { kind: 'bound' }> {
  for (let k = best + step; k >= 0 && k < sizes.length; k += step) {
    if (sizes[k]! <= limit) continue;
    const inside = k - step;
    const share = (limit - sizes[inside]!) / (sizes[k]! - sizes[inside]!);
    return valueFigure(frequenciesHz[inside]! + share * (frequenciesHz[k]! - frequenciesHz[inside]!));
  }
  const endHz = frequenciesHz[step > 0 ? sizes.length - 1 : 0]!;
  return boundFigure(step > 0 ? 'lower' : 'upper', endHz, 'the band ends before the limit is passed');
}

function keeps({ inductive }: { inductive: boolean }): Figure {
  const kind = inductive ? 'inductive (too long)' : 'capacitive (too short)';
  return absentFigure(`no resonance in the band: the antenna stays ${kind}`);
}

/** The imaginary part of S11 has the sign of X: which signs stand out of the noise. Without noise, both. */
function signsShown({ s11, noise }: Reflection): { inductive: boolean; capacitive: boolean } {
  if (!noise) return { inductive: true, capacitive: true };
  const shown = { inductive: false, capacitive: false };
  for (let k = 0; k < noise.length; k += 1) {
    const limit = noiseDeviations * deviation(noise[k]!);
    if (s11[2 * k + 1]! > limit) shown.inductive = true;
    if (s11[2 * k + 1]! < -limit) shown.capacitive = true;
  }
  return shown;
}

function sameWithinNoise(sizes: readonly number[], noise: Float64Array | undefined): boolean {
  if (!noise) return false;
  const mean = sizes.reduce((sum, size) => sum + size, 0) / sizes.length;
  return sizes.every((size, k) => Math.abs(size - mean) <= noiseDeviations * deviation(noise[k]!));
}

/** Standard deviation of one part of a complex noise of that rms amplitude, and of a magnitude well above it. */
function deviation(noise: number): number {
  return noise / Math.SQRT2;
}
