// Squint: how far the beam points away from boresight.
import { wrapDeg } from './angles.ts';
import type { Beamwidth } from './beamwidth.ts';
import { absentFigure, type Figure, type FigureAbsent, valueFigure } from './figure.ts';
import type { Peak } from './peak.ts';

/**
 * Squint: the beam's axis minus boresight, positive towards larger pattern angles.
 *
 * The axis is the middle of the half-power points: the top of a wide beam is so flat that noise moves its
 * largest sample by degrees, while the flanks hold still. Where there are no half-power points the peak
 * stands in, and the note says so.
 *
 * @param peak the cut's peak
 * @param halfPower its half-power beam, or the reason why there is none
 * @param boresightDeg pattern angle of boresight in degrees, 0 unless given
 * @returns degrees in (−180, 180]; absent when no direction is stronger than another
 * Source: IEEE Std 145 (squint; squint angle). Checked: tests/unit/daemon/pattern/squint.test.ts.
 */
export function squint(peak: Peak, halfPower: Beamwidth | FigureAbsent, boresightDeg = 0): Figure {
  if (peak.flat) return absentFigure('the level is the same in all directions: no beam');
  if (halfPower.kind === 'value') return valueFigure(wrapDeg(halfPower.middleDeg - boresightDeg));
  return valueFigure(
    wrapDeg(peak.angleDeg - boresightDeg),
    `of the peak: the half-power beam ${halfPower.because}`,
  );
}
