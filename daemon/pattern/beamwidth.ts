// The width of the main lobe at a stated drop below the peak: half power, 10 dB, or any other.
//
//        level          . · ‾ ‾ · .            reference (peak)
//                    ·               ·
//      - - - - - - ×- - - - - - - - - -×- - -  reference − drop
//                ·  |<---- width ---->|  ·
import { wrapDeg } from './angles.ts';
import type { Cut } from './cut.ts';
import { halfPowerDb } from './decibels.ts';
import { absentFigure, type FigureAbsent } from './figure.ts';
import { angleOnFlankDeg, endInWords, type Flank, flankOf, type Side } from './flank.ts';
import { finite, PatternError, positive } from './pattern-error.ts';
import type { Peak } from './peak.ts';

export interface Beamwidth {
  kind: 'value';
  /** Degrees between the two crossings. */
  value: number;
  /** Pattern angles of the crossings in degrees, wrapped. */
  leftDeg: number;
  rightDeg: number;
  /** Middle of the two crossings, wrapped: the axis of the beam. */
  middleDeg: number;
  /** Degrees from the peak's sample to the crossings, outwards. */
  leftOffsetDeg: number;
  rightOffsetDeg: number;
}

export interface BeamwidthOptions {
  /** Drop below the reference in dB; half power (3.0103 dB) unless given. */
  dropDb?: number;
  /** Level the drop counts from; the peak's refined level unless given. */
  referenceDb?: number;
}

/**
 * Beamwidth of the main lobe.
 *
 * The first crossing on each side of the peak, linear in dB between samples. The drop counts from the
 * refined peak, not from the largest sample: with samples a tenth of the beamwidth apart the largest sample
 * may lie 0.03 dB low, which reads 0.5 % wide.
 *
 * Between samples the chord lies below a lobe that is concave in dB, so that each crossing reads inwards, by
 * up to |L″|·h²/(8·|L′|) for steps of h: always narrow, see `narrowReadingDeg` for how much. A lobe with a
 * shoulder at the crossing may read wide by as much.
 *
 * @param cut levels in dB over degrees
 * @param peak its peak
 * @param options drop and reference level in dB
 * @returns width, crossings and their middle in degrees; absent with the side in words when the level does
 *   not fall that far before the cut ends or comes round
 * @throws PatternError for a drop that is not above zero
 * Source: IEEE Std 145 (half-power beamwidth). Checked: tests/outside (A-COSQ, A-ARR-BROAD, I-INTERP, NEC cuts).
 */
export function beamwidth(cut: Cut, peak: Peak, options: BeamwidthOptions = {}): Beamwidth | FigureAbsent {
  const dropDb = finite('dropDb', options.dropDb ?? halfPowerDb);
  if (dropDb <= 0) {
    throw new PatternError(`A beamwidth ${dropDb} dB below the peak; hand in a drop above zero.`, { dropDb });
  }
  const thresholdDb = finite('referenceDb', options.referenceDb ?? peak.levelDb) - dropDb;
  if (cut.levelDb[peak.index]! <= thresholdDb) {
    return absentFigure('the samples are too far apart for the width of the lobe');
  }
  const left = crossing(cut, peak, 'left', thresholdDb);
  const right = crossing(cut, peak, 'right', thresholdDb);
  if (left.offsetDeg === undefined || right.offsetDeg === undefined) {
    return absentFigure(becauseNoCrossing(left, right, dropDb));
  }
  const originDeg = cut.anglesDeg[peak.index]!;
  return {
    kind: 'value',
    value: left.offsetDeg + right.offsetDeg,
    leftDeg: angleOnFlankDeg(left.flank, left.offsetDeg),
    rightDeg: angleOnFlankDeg(right.flank, right.offsetDeg),
    middleDeg: wrapDeg(originDeg + (right.offsetDeg - left.offsetDeg) / 2),
    leftOffsetDeg: left.offsetDeg,
    rightOffsetDeg: right.offsetDeg,
  };
}

/**
 * How much narrow a half-power beamwidth may read from samples of a certain step: an estimate.
 *
 * Twice |L″|·h²/(8·|L′|) for a lobe that is a parabola in dB, L = −c·u²: h²/(2·width) when both crossings lie
 * midway between samples, two thirds of that in the mean. 0.35 % at a twelfth of the width, 0.5 % at a tenth.
 *
 * @param widthDeg half-power beamwidth in degrees, above 0
 * @param stepDeg step of the samples in degrees, above 0
 * @returns degrees
 * @throws PatternError for numbers that are not above zero
 * Source: error of linear interpolation, closed form. Checked: tests/unit/daemon/pattern/beamwidth.test.ts.
 */
export function narrowReadingDeg(widthDeg: number, stepDeg: number): number {
  return positive('stepDeg', stepDeg) ** 2 / (2 * positive('widthDeg', widthDeg));
}

interface Crossing {
  flank: Flank;
  offsetDeg: number | undefined;
}

function crossing(cut: Cut, peak: Peak, side: Side, thresholdDb: number): Crossing {
  const flank = flankOf(cut, peak.index, side);
  const { offsetsDeg, levelDb } = flank;
  for (let k = 1; k < levelDb.length; k += 1) {
    if (levelDb[k]! > thresholdDb) continue;
    const share = (levelDb[k - 1]! - thresholdDb) / (levelDb[k - 1]! - levelDb[k]!);
    const offsetDeg = offsetsDeg[k - 1]! + share * (offsetsDeg[k]! - offsetsDeg[k - 1]!);
    return { flank, offsetDeg };
  }
  return { flank, offsetDeg: undefined };
}

function becauseNoCrossing(left: Crossing, right: Crossing, dropDb: number): string {
  const drop = Number(dropDb.toFixed(1));
  if (left.flank.closed) return `omnidirectional: does not fall ${drop} dB in any direction`;
  if (left.offsetDeg === undefined && right.offsetDeg === undefined) {
    return `does not fall ${drop} dB on either side of the peak`;
  }
  const missing = left.offsetDeg === undefined ? left : right;
  return `does not fall ${drop} dB on the ${missing.flank.side} side: ${endInWords(missing.flank)}`;
}
