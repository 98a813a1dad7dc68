// What a level is worth beside the range's floor: a value, a flagged value, or an upper bound. How the floor
// is measured is not told here.
import { boundFigure, type Figure, valueFigure } from './figure.ts';
import { finite } from './pattern-error.ts';

/** Below this many dB over the floor a level is flagged. Common practice asks for 20 to 30 dB. */
export const flagMarginDb = 20;
/** Within this many dB of the floor a level is an upper bound. */
export const boundMarginDb = 3;
/** With no floor stated, nothing further below the peak than this counts as resolved. */
export const unstatedFloorDb = 120;

export interface Floor {
  /** The floor itself, in the unit of the cut's levels. */
  floorDb: number;
  /** At or below this a level is an upper bound. */
  resolvedDb: number;
  /** Below this a level is flagged; never when no floor was stated. */
  flaggedDb: number;
}

/**
 * The floor beside a peak.
 *
 * @param peakDb level of the cut's peak in dB
 * @param floorDb the range's floor in the same unit, where it is known
 * @returns the limits; without a stated floor, `unstatedFloorDb` below the peak
 * Source: common practice (margin of 20 dB, see I-NULLMARGIN in tests/outside).
 */
export function floorBeside(peakDb: number, floorDb?: number): Floor {
  if (floorDb === undefined) {
    const assumedDb = peakDb - unstatedFloorDb;
    return { floorDb: assumedDb, resolvedDb: assumedDb, flaggedDb: assumedDb };
  }
  return {
    floorDb: finite('floorDb', floorDb),
    resolvedDb: floorDb + boundMarginDb,
    flaggedDb: floorDb + flagMarginDb,
  };
}

/**
 * How far a level lies below the peak, in positive dB: front-to-back, null depth, circularity.
 *
 * @param peakDb level of the peak in dB
 * @param levelDb the weaker level in dB
 * @param floor limits beside that peak
 * @returns peak − level; a lower bound when the weaker level is not resolved, with a note when flagged
 * Checked: tests/unit/daemon/pattern/floor.test.ts.
 */
export function dropBelowPeak(peakDb: number, levelDb: number, floor: Floor): Figure {
  if (levelDb <= floor.resolvedDb) {
    const bound = Math.max(0, peakDb - Math.max(levelDb, floor.floorDb));
    return boundFigure('lower', bound, 'the weaker level is not resolved from the floor');
  }
  return valueFigure(peakDb - levelDb, flagNote(levelDb, floor));
}

/** The note for a level near the floor; undefined when it is clear of it. */
export function flagNote(levelDb: number, floor: Floor): string | undefined {
  return levelDb < floor.flaggedDb ? `within ${flagMarginDb} dB of the floor` : undefined;
}
