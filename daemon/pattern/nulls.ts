// The nulls beside the main lobe and what is read from them: first-null beamwidth and null depth.
import type { Extrema, Extremum } from './extrema.ts';
import { absentFigure, type Figure, type FigureAbsent, valueFigure } from './figure.ts';
import type { Side } from './flank.ts';
import { dropBelowPeak, type Floor } from './floor.ts';

/**
 * The first null on one side of the main lobe.
 *
 * @param extrema nulls and lobes of the cut
 * @param side left (smaller angles) or right
 * @returns the null; absent when the level does not turn up again by the stated prominence
 * Source: IEEE Std 145. Checked: tests/outside (A-LINE-L10).
 */
export function firstNull(extrema: Extrema, side: Side): Extremum | FigureAbsent {
  const found = extrema[side][0];
  if (found) return found;
  const where = extrema.periodic ? 'in any direction' : `on the ${side} side before the cut ends`;
  return absentFigure(`no null ${extrema.prominenceDb} dB deep ${where}`);
}

/**
 * First-null beamwidth: degrees between the nulls on both sides of the main lobe.
 *
 * @param extrema nulls and lobes of the cut
 * @returns the width in degrees; absent with the side in words where a null is missing, and where both
 *   sides run into one and the same null (a cardioid)
 * Source: IEEE Std 145. Checked: tests/outside (A-LINE-FNBW, A-ARR-BROAD, A-TAPER, A-CIRC-FNBW).
 */
export function firstNullBeamwidth(extrema: Extrema): Figure {
  const left = firstNull(extrema, 'left');
  const right = firstNull(extrema, 'right');
  if (left.kind === 'absent') return left;
  if (right.kind === 'absent') return right;
  if (extrema.periodic && extrema.right.length === 1) {
    return valueFigure(360, 'one null alone, met from both sides');
  }
  return valueFigure(left.offsetDeg + right.offsetDeg);
}

/**
 * Depth of a null below the peak, in positive dB.
 *
 * @param found a null of the cut
 * @param peakDb level of the peak in dB
 * @param floor limits beside that peak
 * @returns peak − null; a lower bound when the null is not resolved from the floor
 */
export function nullDepthDb(found: Extremum, peakDb: number, floor: Floor): Figure {
  return dropBelowPeak(peakDb, found.levelDb, floor);
}
