// Side lobes: the first on each side of the main lobe, and the highest of all. Levels are relative to the
// peak, in negative dB. A lobe that has run into the main lobe is reported as a shoulder.
import type { Cut } from './cut.ts';
import type { Extrema, Extremum } from './extrema.ts';
import { absentFigure, type Figure, valueFigure } from './figure.ts';
import { flankOf, type Side } from './flank.ts';
import { type Floor, flagNote } from './floor.ts';
import type { Peak } from './peak.ts';
import { type Shoulder, shoulderOn } from './shoulder.ts';

/**
 * All lobes of a cut but the main one, by angle outwards from the peak; the right side first.
 *
 * @param extrema nulls and lobes of the cut
 * @returns the lobes, the back lobe among them
 * Source: IEEE Std 145 (minor lobe). Checked: tests/outside (A-LINE-SLL, A-CIRC-SLL, A-TAPER).
 */
export function lobesOf(extrema: Extrema): Extremum[] {
  const rows = extrema.periodic ? [extrema.right] : [extrema.right, extrema.left];
  return rows.flat().filter((found) => found.kind === 'lobe');
}

/**
 * First side lobe on one side of the main lobe, relative to the peak.
 *
 * A shoulder on the flank comes first and is noted as such. Where the turn holds one lobe alone besides the
 * main one, it is the first from both sides.
 *
 * @param cut levels in dB over degrees
 * @param peak its peak
 * @param extrema nulls and lobes of the cut
 * @param side left (smaller angles) or right
 * @param floor limits beside the peak
 * @returns level in dB, 0 or below, with its angle in the note; absent when there is no lobe on that side
 * Source: IEEE Std 145. Checked: tests/outside (A-ARR-BROAD, NEC cuts).
 */
export function firstSideLobeDb(cut: Cut, peak: Peak, extrema: Extrema, side: Side, floor: Floor): Figure {
  const shoulder = shoulderBeside(cut, peak, extrema, side);
  if (shoulder) return relative(shoulder, peak, floor, 'shoulder');
  const lobe = extrema[side].find((found) => found.kind === 'lobe');
  if (lobe) return relative(lobe, peak, floor, 'lobe');
  const where = extrema.periodic ? 'in the turn' : `on the ${side} side before the cut ends`;
  return absentFigure(`no side lobe that stands out by ${extrema.prominenceDb} dB ${where}`);
}

/**
 * Side lobe level: the highest lobe but the main one, relative to the peak; the back lobe counts.
 *
 * @param extrema nulls and lobes of the cut
 * @param peak its peak
 * @param floor limits beside the peak
 * @returns level in dB, 0 or below, with its angle in the note; absent when there is no lobe. Shoulders do
 *   not count here: they have no top
 * Source: IEEE Std 145 (side lobe level). Checked: tests/outside (A-ARR-BROAD, A-ARR-END, A-CHEB10-SLL).
 */
export function sideLobeLevelDb(extrema: Extrema, peak: Peak, floor: Floor): Figure {
  const lobes = lobesOf(extrema);
  const highest = lobes.reduce((best, lobe) => (lobe.levelDb > best.levelDb ? lobe : best), lobes[0]!);
  if (highest) return relative(highest, peak, floor, 'lobe');
  return absentFigure(`no side lobe that stands out by ${extrema.prominenceDb} dB`);
}

/**
 * Shoulder between the peak and the first null of one side.
 *
 * @returns the shoulder, or undefined
 */
export function shoulderBeside(cut: Cut, peak: Peak, extrema: Extrema, side: Side): Shoulder | undefined {
  const toOffsetDeg = extrema[side][0]?.offsetDeg ?? (cut.periodic ? 180 : endOffsetDeg(cut, peak, side));
  return shoulderOn(cut, peak, side, toOffsetDeg, extrema.prominenceDb, extrema.noiseDb);
}

function endOffsetDeg(cut: Cut, peak: Peak, side: Side): number {
  return flankOf(cut, peak.index, side).offsetsDeg.at(-1) ?? 0;
}

function relative(
  found: { angleDeg: number; levelDb: number },
  peak: Peak,
  floor: Floor,
  what: 'lobe' | 'shoulder',
): Figure {
  const flag = flagNote(found.levelDb, floor);
  const place = `${what} at ${Number(found.angleDeg.toFixed(1))}°`;
  return valueFigure(Math.min(0, found.levelDb - peak.levelDb), flag ? `${place}, ${flag}` : place);
}
