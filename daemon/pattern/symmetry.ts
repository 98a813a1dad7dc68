// Beam symmetry: how alike the two sides of the main lobe are about its axis.
import type { Beamwidth } from './beamwidth.ts';
import type { Cut } from './cut.ts';
import { absentFigure, type Figure, type FigureAbsent, valueFigure } from './figure.ts';
import { levelAt } from './level-at.ts';

/**
 * Beam asymmetry: the largest difference between levels at equal angles left and right of the beam's axis.
 *
 * Within the half-power beam, at the angles of the cut's samples, the other side linear in dB.
 *
 * @param cut levels in dB over degrees
 * @param halfPower its half-power beam, or the reason why there is none
 * @returns dB, 0 for a symmetrical beam; absent without a half-power beam
 * Source: common practice, no source. Checked: tests/unit/daemon/pattern/squint.test.ts.
 */
export function beamAsymmetryDb(cut: Cut, halfPower: Beamwidth | FigureAbsent): Figure {
  if (halfPower.kind === 'absent') return absentFigure(`no half-power beam: ${halfPower.because}`);
  let largest = 0;
  for (let k = 0; k < cut.anglesDeg.length; k += 1) {
    const angleDeg = cut.anglesDeg[k]!;
    const turns = Math.round((angleDeg - halfPower.middleDeg) / 360);
    const awayDeg = angleDeg - halfPower.middleDeg - 360 * turns;
    if (Math.abs(awayDeg) > halfPower.value / 2) continue;
    const opposite = levelAt(cut, halfPower.middleDeg - awayDeg);
    if (opposite.kind === 'value') largest = Math.max(largest, Math.abs(cut.levelDb[k]! - opposite.value));
  }
  return valueFigure(largest);
}
