// The match part of the figures document: VSWR and return loss over the band, best match, resonance, and
// the factor on the elements' length that would bring the resonance to the marker.
import { absentFigure, type Figure, valueFigure } from '../pattern/figure.ts';
import { returnLossDb, vswr } from '../pattern/match.ts';
import { bestMatch, lengthScale, resonance } from '../pattern/match-band.ts';
import { entryOf } from './figure-entry.ts';
import type { FiguresDocument } from './figures-document.ts';
import { magnitudes } from './mean-trace.ts';

/**
 * `reflection`: complex S11 (or S22) at N frequencies, interleaved; `noise`: rms amplitude of its noise at
 * each of them, where it is known.
 */
export function matchFigures(
  frequenciesHz: readonly number[],
  reflection: Float64Array,
  markerHz: number | undefined,
  noise?: Float64Array,
): NonNullable<FiguresDocument['match']> {
  const sizes = Array.from(magnitudes(reflection));
  const band = {
    frequenciesHz: Float64Array.from(frequenciesHz),
    s11: reflection,
    ...(noise ? { noise } : {}),
  };
  const resonanceHz = resonance(band);
  return {
    vswr: sizes.map((size, k) => entryOf(vswr(size, noise?.[k]))),
    returnLossDb: sizes.map((size, k) => entryOf(returnLossDb(size, noise?.[k]))),
    resonanceHz: entryOf(resonanceHz),
    bestMatchHz: entryOf(bestMatch(band).frequencyHz),
    ...(markerHz === undefined ? {} : { markerHz }),
    lengthScale: entryOf(scale(resonanceHz, markerHz)),
  };
}

function scale(resonanceHz: Figure, markerHz: number | undefined): Figure {
  if (markerHz === undefined) return absentFigure('the plan has no marker frequency');
  if (resonanceHz.kind !== 'value') return absentFigure('no resonance was found in the band');
  return valueFigure(lengthScale(resonanceHz.value, markerHz));
}
