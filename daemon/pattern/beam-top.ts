// A beam's top, read from many samples. The largest of many noisy samples lies above the true top, which
// narrows a beamwidth that counts from it: at 0.02 dB of noise a beam of 60°, sampled every degree, reads
// 0.17° narrow in the mean. And it may lie degrees away from the top, so flat is a wide beam. A smooth curve
// through the top has neither fault. Which of the two angles counts is told in pointing.ts.
//
//      - - - - - - - - - - largest sample
//            .·‾‾·.        curve: its largest level is the reference
//          ·        ·
//       |<-- window -->|   the middle four tenths of the half-power beam
import { wrapDeg } from './angles.ts';
import type { Beamwidth } from './beamwidth.ts';
import type { Cut } from './cut.ts';
import { flankOf } from './flank.ts';
import type { Peak } from './peak.ts';

/** Half the window over half the beamwidth: 0.5 dB of a smooth lobe, where a fourth degree is ample. */
const windowShare = 0.4;
/** Below this many samples in the window the curve smooths nothing. */
const fewestSamples = 9;
/** A curve further than this from the peak does not describe it: a beam with several tops. */
const largestDifferenceDb = 0.25;
const coefficients = 5;

export interface BeamTop {
  /** Level for beamwidths to count from, in dB. */
  levelDb: number;
  /** The curve's own top; undefined where there is no curve, and the level is that of the refined peak. */
  curve?: CurveTop;
}

export interface CurveTop {
  /** Pattern angle of the curve's largest value in degrees, wrapped. */
  angleDeg: number;
  /** Second derivative there, in dB per degree squared, below 0. */
  bendDb: number;
  /** Standard deviation of the angle, in degrees for each dB of standard deviation of one level. */
  angleDegPerDb: number;
}

/**
 * Top of a beam: a level for beamwidths to count from, and the angle where a smooth curve has it.
 *
 * Least squares, fourth degree, over the samples in the middle of the half-power beam. The largest level of
 * that curve stands in for the refined peak. Without noise the two agree to 0.0001 dB on the lobes of
 * cos^q and of uniform apertures; with noise the largest sample's bias is gone. The angle's deviation is
 * that of the curve's slope over its bend, to first order, for levels with noise of their own each.
 *
 * @param cut levels in dB over degrees
 * @param peak its peak
 * @param halfPower the half-power beam read against the refined peak
 * @returns the curve's level and angle; the level of the refined peak alone where there are too few samples,
 *   the curve's top lies at the window's edge, or the two levels differ by more than 0.25 dB
 * Source: linear least squares, closed form. Checked: tests/unit/daemon/pattern/beam-top.test.ts.
 */
export function beamTop(cut: Cut, peak: Peak, halfPower: Beamwidth): BeamTop {
  const reach = (windowShare * halfPower.value) / 2;
  const middle = (halfPower.rightOffsetDeg - halfPower.leftOffsetDeg) / 2;
  const points = windowPoints(cut, peak, middle, reach);
  if (points.x.length < fewestSamples) return { levelDb: peak.levelDb };
  const curve = solved(normalEquations(points.x, points.y));
  const x = curve && topOf(curve);
  if (!curve || x === undefined) return { levelDb: peak.levelDb };
  const top = valueAt(curve, x);
  if (Math.abs(top) > largestDifferenceDb) return { levelDb: peak.levelDb };
  const bend = bendAt(curve, x);
  const slope = slopeDeviation(points.x, x);
  const levelDb = peak.levelDb + top;
  if (bend >= 0 || slope === undefined) return { levelDb };
  return {
    levelDb,
    curve: {
      angleDeg: wrapDeg(cut.anglesDeg[peak.index]! + middle + reach * x),
      bendDb: bend / reach ** 2,
      angleDegPerDb: (reach * slope) / -bend,
    },
  };
}

/** Samples in the window: x from −1 to 1, y relative to the peak. */
function windowPoints(cut: Cut, peak: Peak, middle: number, reach: number): { x: number[]; y: number[] } {
  const x: number[] = [];
  const y: number[] = [];
  for (const side of ['left', 'right'] as const) {
    const { offsetsDeg, levelDb } = flankOf(cut, peak.index, side);
    const sign = side === 'right' ? 1 : -1;
    // The sample at the peak is on both flanks and counted once.
    for (let k = side === 'right' ? 0 : 1; k < levelDb.length && offsetsDeg[k]! <= 360; k += 1) {
      const place = (sign * offsetsDeg[k]! - middle) / reach;
      if (Math.abs(place) > 1) {
        if (sign * place > 1) break;
        continue;
      }
      x.push(place);
      y.push(levelDb[k]! - peak.levelDb);
    }
  }
  return { x, y };
}

/** Rows [A | b] for the coefficients of 1, x … x⁴; x in −1 … 1 keeps them well conditioned. */
function normalEquations(x: readonly number[], y: readonly number[]): number[][] {
  const rows = Array.from({ length: coefficients }, () => new Array<number>(coefficients + 1).fill(0));
  for (let k = 0; k < x.length; k += 1) {
    const powers = [1];
    for (let p = 1; p < coefficients; p += 1) powers.push(powers[p - 1]! * x[k]!);
    for (let r = 0; r < coefficients; r += 1) {
      for (let c = 0; c < coefficients; c += 1) rows[r]![c]! += powers[r]! * powers[c]!;
      rows[r]![coefficients]! += powers[r]! * y[k]!;
    }
  }
  return rows;
}

/** Gauss–Jordan with row exchange on rows [A | b]; undefined when A is singular. */
function solved(rows: number[][]): number[] | undefined {
  const size = rows.length;
  for (let step = 0; step < size; step += 1) {
    let pivot = step;
    for (let r = step + 1; r < size; r += 1) {
      if (Math.abs(rows[r]![step]!) > Math.abs(rows[pivot]![step]!)) pivot = r;
    }
    [rows[step], rows[pivot]] = [rows[pivot]!, rows[step]!];
    const divisor = rows[step]![step]!;
    if (Math.abs(divisor) < 1e-9) return undefined;
    for (let r = 0; r < size; r += 1) {
      if (r === step) continue;
      const factor = rows[r]![step]! / divisor;
      for (let c = step; c <= size; c += 1) rows[r]![c]! -= factor * rows[step]![c]!;
    }
  }
  return rows.map((row, k) => row[size]! / row[k]!);
}

/**
 * Standard deviation of the curve's slope at a place, for a deviation of 1 of each sample: √(gᵀ A⁻¹ g), with
 * A the normal equations and g the slopes of 1, x … x⁴ there.
 */
function slopeDeviation(places: readonly number[], x: number): number | undefined {
  const rows = normalEquations(places, new Array<number>(places.length).fill(0));
  const slopes = [0, 1, 2 * x, 3 * x ** 2, 4 * x ** 3];
  for (const [r, row] of rows.entries()) row[coefficients] = slopes[r]!;
  const shares = solved(rows);
  return shares && Math.sqrt(shares.reduce((sum, share, k) => sum + share * slopes[k]!, 0));
}

/** Where the curve is largest inside the window: a scan, then Newton steps on its slope. */
function topOf(curve: readonly number[]): number | undefined {
  let best = -1;
  for (let x = -1; x <= 1.0001; x += 0.05) if (valueAt(curve, x) > valueAt(curve, best)) best = x;
  if (Math.abs(best) > 0.97) return undefined;
  let x = best;
  for (let step = 0; step < 4; step += 1) {
    const bend = bendAt(curve, x);
    if (bend >= 0) break;
    x = Math.min(best + 0.05, Math.max(best - 0.05, x - slopeAt(curve, x) / bend));
  }
  return valueAt(curve, x) > valueAt(curve, best) ? x : best;
}

function valueAt([c0, c1, c2, c3, c4]: readonly number[], x: number): number {
  return c0! + x * (c1! + x * (c2! + x * (c3! + x * c4!)));
}

function slopeAt([, c1, c2, c3, c4]: readonly number[], x: number): number {
  return c1! + x * (2 * c2! + x * (3 * c3! + x * 4 * c4!));
}

function bendAt([, , c2, c3, c4]: readonly number[], x: number): number {
  return 2 * c2! + x * (6 * c3! + x * 12 * c4!);
}
