// Squint: how far the beam points away from boresight.
import { wrapDeg } from './angles.ts';
import type { Beamwidth } from './beamwidth.ts';
import { absentFigure, type Figure, type FigureAbsent, valueFigure } from './figure.ts';

/**
 * Squint: the beam's axis minus boresight, positive towards larger pattern angles.
 *
 * The axis is the middle of the half-power points: the top of a wide beam is so flat that noise moves its
 * largest sample by degrees, while the flanks hold still.
 *
 * @param halfPower the cut's half-power beam, or the reason why there is none
 * @param boresightDeg pattern angle of boresight in degrees, 0 unless given
 * @returns degrees in (−180, 180]; absent without half-power points: an omnidirectional cut has no axis, and
 *   of a cut too short the direction of the peak says what there is to say
 * Source: IEEE Std 145 (squint; squint angle). Checked: tests/unit/daemon/pattern/squint.test.ts.
 */
export function squint(halfPower: Beamwidth | FigureAbsent, boresightDeg = 0): Figure {
  if (halfPower.kind === 'absent') return absentFigure(`no half-power beam: ${halfPower.because}`);
  return valueFigure(wrapDeg(halfPower.middleDeg - boresightDeg));
}
