// Front-to-back ratio: how much weaker the antenna is straight behind its peak.
import type { Cut } from './cut.ts';
import { absentFigure, type Figure } from './figure.ts';
import { dropBelowPeak, type Floor } from './floor.ts';
import { levelAt } from './level-at.ts';
import type { Peak } from './peak.ts';

/**
 * Front-to-back ratio: the peak minus the level at peak + 180°.
 *
 * The level behind is linear in dB between its two samples.
 *
 * @param cut levels in dB over degrees
 * @param peak its peak
 * @param floor limits beside the peak
 * @returns positive dB; a lower bound where the level behind is not resolved from the floor; absent when
 *   the cut does not reach round to the back, or no direction is the front
 * Source: IEEE Std 145 (front-to-back ratio). Checked: tests/outside (A-CARD, NEC cuts).
 */
export function frontToBack(cut: Cut, peak: Peak, floor: Floor): Figure {
  if (peak.flat) return absentFigure('the level is the same in all directions: no front');
  const behind = levelAt(cut, peak.angleDeg + 180);
  return behind.kind === 'value' ? dropBelowPeak(peak.levelDb, behind.value, floor) : behind;
}
