// Front-to-rear ratio: how much weaker the antenna is in its whole rear sector, at the worst direction there.
import { wrapDeg } from './angles.ts';
import type { Cut } from './cut.ts';
import { absentFigure, type Figure } from './figure.ts';
import { dropBelowPeak, type Floor } from './floor.ts';
import { levelAt } from './level-at.ts';
import { finite, PatternError } from './pattern-error.ts';
import { type Peak, refinedMaximum } from './peak.ts';

/** The rear sector reaches this far to both sides of peak + 180°, unless the caller says otherwise. */
export const usualRearHalfWidthDeg = 60;

/**
 * Front-to-rear ratio: the peak minus the highest level within peak + 180° ± the half width.
 *
 * The sector's edges count, linear in dB between samples; a lobe inside it is refined by a parabola.
 *
 * @param cut levels in dB over degrees
 * @param peak its peak
 * @param floor limits beside the peak
 * @param rearHalfWidthDeg half the sector in degrees, 0 to 180
 * @returns positive dB; a lower bound where the sector is not resolved from the floor; absent when the cut
 *   does not cover the sector, or no direction is the front
 * @throws PatternError for a half width outside 0 to 180
 * Source: common practice, no source; the sector is the one of the NEC cuts in tests/outside. Checked there.
 */
export function frontToRear(
  cut: Cut,
  peak: Peak,
  floor: Floor,
  rearHalfWidthDeg: number = usualRearHalfWidthDeg,
): Figure {
  const halfWidthDeg = finite('rearHalfWidthDeg', rearHalfWidthDeg);
  if (halfWidthDeg < 0 || halfWidthDeg > 180) {
    throw new PatternError(`A rear sector of ±${halfWidthDeg}°; hand in 0 to 180.`, { halfWidthDeg });
  }
  if (peak.flat) return absentFigure('the level is the same in all directions: no front');
  const rearDeg = peak.angleDeg + 180;
  const highestDb = highestWithin(cut, rearDeg, halfWidthDeg);
  if (highestDb === undefined) {
    return absentFigure(`the cut does not cover the rear sector of 180° ± ${halfWidthDeg}°`);
  }
  return dropBelowPeak(peak.levelDb, Math.min(highestDb, peak.levelDb), floor);
}

function highestWithin(cut: Cut, centreDeg: number, halfWidthDeg: number): number | undefined {
  const edges = [levelAt(cut, centreDeg - halfWidthDeg), levelAt(cut, centreDeg + halfWidthDeg)];
  let highestDb = Number.NEGATIVE_INFINITY;
  for (const edge of edges) {
    if (edge.kind !== 'value') return undefined;
    highestDb = Math.max(highestDb, edge.value);
  }
  if (!cut.periodic && gapLiesWithin(cut, centreDeg, halfWidthDeg)) return undefined;
  for (let k = 0; k < cut.anglesDeg.length; k += 1) {
    if (Math.abs(wrapDeg(cut.anglesDeg[k]! - centreDeg)) > halfWidthDeg + 1e-9) continue;
    const lobe = isLocalMaximum(cut, k) ? refinedMaximum(cut, k) : undefined;
    const inside = lobe && Math.abs(wrapDeg(lobe.angleDeg - centreDeg)) <= halfWidthDeg;
    highestDb = Math.max(highestDb, inside ? lobe.levelDb : cut.levelDb[k]!);
  }
  return highestDb;
}

/** Both edges measured, and yet the unmeasured part of the turn between them. */
function gapLiesWithin(cut: Cut, centreDeg: number, halfWidthDeg: number): boolean {
  const firstDeg = cut.anglesDeg[0]!;
  const lastDeg = cut.anglesDeg.at(-1)!;
  if (360 - (lastDeg - firstDeg) <= 1e-9) return false;
  const middleOfGapDeg = (lastDeg + firstDeg + 360) / 2;
  return Math.abs(wrapDeg(middleOfGapDeg - centreDeg)) <= halfWidthDeg;
}

function isLocalMaximum(cut: Cut, k: number): boolean {
  const count = cut.levelDb.length;
  const before = cut.levelDb[(k + count - 1) % count]!;
  const after = cut.levelDb[(k + 1) % count]!;
  return cut.levelDb[k]! >= before && cut.levelDb[k]! >= after;
}
