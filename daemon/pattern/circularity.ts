// Circularity of an omnidirectional antenna: how uneven it is round the turn.
import type { Cut } from './cut.ts';
import { absentFigure, type Figure } from './figure.ts';
import { dropBelowPeak, type Floor } from './floor.ts';

/**
 * Circularity: the largest minus the least level round a full turn, as sampled.
 *
 * @param cut levels in dB over degrees
 * @param floor limits beside the cut's peak
 * @returns dB, 0 for a perfect circle; a lower bound where the least level is not resolved from the floor;
 *   absent for a part of a turn
 * Source: common practice (maximum minus minimum; not half of it). Checked: tests/outside (NEC cuts).
 */
export function circularity(cut: Cut, floor: Floor): Figure {
  if (!cut.periodic) return absentFigure('the cut is no full turn');
  let largest = cut.levelDb[0]!;
  let least = largest;
  for (const levelDb of cut.levelDb) {
    if (levelDb > largest) largest = levelDb;
    if (levelDb < least) least = levelDb;
  }
  return dropBelowPeak(largest, least, floor);
}
