// All figures of one cut at one frequency, under the keys that the figures document prints. The order of
// the work: check, peak, half-power beam (twice: see beam-top.ts), direction, nulls and lobes, ratios.
import { beamTop } from './beam-top.ts';
import { type Beamwidth, beamwidth } from './beamwidth.ts';
import { circularity } from './circularity.ts';
import { type Cut, checkCut } from './cut.ts';
import { cutNoiseDb } from './cut-noise.ts';
import { type Extrema, extremaOf } from './extrema.ts';
import { absentFigure, type Figure, type FigureAbsent, valueFigure } from './figure.ts';
import { boundMarginDb, type Floor, floorBeside } from './floor.ts';
import { frontToBack } from './front-to-back.ts';
import { frontToRear } from './front-to-rear.ts';
import { firstNullBeamwidth } from './nulls.ts';
import { finite } from './pattern-error.ts';
import { type Peak, peakOf } from './peak.ts';
import { pointing } from './pointing.ts';
import { firstSideLobeDb, sideLobeLevelDb } from './side-lobes.ts';
import { squint } from './squint.ts';

/** Keys of `cutFigures`, in the order they are printed. */
export const cutFigureKeys = [
  'peakDeg',
  'halfPowerBeamwidthDeg',
  'tenDbBeamwidthDeg',
  'firstNullBeamwidthDeg',
  'squintDeg',
  'frontToBackDb',
  'frontToRearDb',
  'firstSideLobeLeftDb',
  'firstSideLobeRightDb',
  'sideLobeLevelDb',
  'circularityDb',
] as const;

export type CutFigureKey = (typeof cutFigureKeys)[number];

/** `realizedGainDbi` is there when the options carry what turns levels into gain. */
export type CutFigures = Record<CutFigureKey, Figure> & { realizedGainDbi?: Figure };

export interface CutFigureOptions {
  /** Pattern angle of boresight in degrees; 0 unless given. */
  boresightDeg?: number;
  /** Smallest rise and fall beside a lobe or null, in dB; 1 unless given. */
  prominenceDb?: number;
  /** Half the rear sector in degrees; 60 unless given. */
  rearHalfWidthDeg?: number;
  /** The range's floor at this frequency, in the unit of the cut's levels, where it is known. */
  floorDb?: number;
  /** Realized gain in dBi of a level of 0 dB, from `gainConstantDb`; 0 for levels that are gain already. */
  gainConstantDb?: number;
}

/**
 * All figures of one cut at one frequency.
 *
 * With `floorDb` the direction of the peak, and with it front-to-back and front-to-rear, is that of the
 * beam's top as a curve where noise would move the three-neighbour parabola further: see `pointing`.
 * Works on any `Cut`, level-only or complex; 401 frequencies of 361 angles take well under a second.
 *
 * @param cut N angles in degrees (ascending, less than one turn) and N levels in dB; `periodic` for a full turn
 * @param options boresight, prominence, rear sector, floor and gain constant
 * @returns one `Figure` for each key: value, bound, or the reason why there is none; never NaN or Infinity
 * @throws PatternError for a cut or option that does not fit
 * Source: each figure's own file. Checked: tests/outside, tests/unit/daemon/pattern/figures.test.ts.
 */
export function cutFigures(cut: Cut, options: CutFigureOptions = {}): CutFigures {
  checkCut(cut);
  const peak = peakOf(cut, options.floorDb);
  const floor = floorBeside(peak.levelDb, options.floorDb);
  if (options.floorDb !== undefined && peak.levelDb <= floor.resolvedDb) return unresolved(options);
  const firstReading = beamwidth(cut, peak);
  const top = firstReading.kind === 'value' ? beamTop(cut, peak, firstReading) : undefined;
  const referenceDb = top?.levelDb ?? peak.levelDb;
  const pointed = pointing(cut, peak, top, options.floorDb);
  const halfPower = beamwidth(cut, peak, { referenceDb });
  const tenDb = beamwidth(cut, peak, { dropDb: 10, referenceDb });
  const extrema = extremaAboveNoise(cut, peak, firstReading, floor, options);
  const figures: CutFigures = {
    peakDeg: peakDirection(pointed),
    halfPowerBeamwidthDeg: halfPower.kind === 'value' ? valueFigure(halfPower.value) : halfPower,
    tenDbBeamwidthDeg: tenDb.kind === 'value' ? valueFigure(tenDb.value) : tenDb,
    firstNullBeamwidthDeg: firstNullBeamwidth(extrema),
    squintDeg: squint(halfPower, finite('boresightDeg', options.boresightDeg ?? 0)),
    frontToBackDb: frontToBack(cut, pointed, floor),
    frontToRearDb: frontToRear(cut, pointed, floor, options.rearHalfWidthDeg),
    firstSideLobeLeftDb: firstSideLobeDb(cut, peak, extrema, 'left', floor),
    firstSideLobeRightDb: firstSideLobeDb(cut, peak, extrema, 'right', floor),
    sideLobeLevelDb: sideLobeLevelDb(extrema, peak, floor),
    circularityDb: circularity(cut, floor),
  };
  // Counted from the beam's top as beamwidths are: the largest of many noisy samples lies above it.
  const gainLevelDb = peak.flat ? meanDb(cut) : referenceDb;
  return withGain(figures, options, (constantDb) => valueFigure(gainLevelDb + constantDb));
}

/** Lobes must stand out of the stated floor, and of the noise that the cut itself shows. */
function extremaAboveNoise(
  cut: Cut,
  peak: Peak,
  halfPower: Beamwidth | FigureAbsent,
  floor: Floor,
  options: CutFigureOptions,
): Extrema {
  const noiseDb = Math.max(floor.floorDb, cutNoiseDb(cut, peak, halfPower) ?? floor.floorDb);
  return extremaOf(cut, peak, {
    resolvedDb: Math.max(floor.resolvedDb, Math.min(noiseDb + boundMarginDb, peak.levelDb)),
    noiseDb,
    ...(options.prominenceDb === undefined ? {} : { prominenceDb: options.prominenceDb }),
  });
}

function meanDb({ levelDb }: Cut): number {
  return levelDb.reduce((sum, level) => sum + level, 0) / levelDb.length;
}

function peakDirection(peak: Peak): Figure {
  if (peak.flat) return absentFigure('the level is the same in all directions');
  return valueFigure(peak.angleDeg, peak.because && `as sampled: ${peak.because}`);
}

/** A peak that drowns in the floor carries no pattern; only that its gain is at most so much. */
function unresolved(options: CutFigureOptions): CutFigures {
  const because = 'the peak is not resolved from the floor';
  const figures = Object.fromEntries(cutFigureKeys.map((key) => [key, absentFigure(because)]));
  return withGain(figures as CutFigures, options, () => absentFigure(because));
}

function withGain(
  figures: CutFigures,
  options: CutFigureOptions,
  gain: (constantDb: number) => Figure,
): CutFigures {
  if (options.gainConstantDb === undefined) return figures;
  return { ...figures, realizedGainDbi: gain(finite('gainConstantDb', options.gainConstantDb)) };
}
