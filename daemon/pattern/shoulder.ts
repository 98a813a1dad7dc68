// A shoulder: a side lobe that has run into the main lobe, with no null between. The flank keeps falling,
// only less steeply for a while.
//
//   level ╲                 leaned up by a share of its steepness:   ╲    ╱╲
//          ╲___ shoulder                                             ╲__╱  ╲
//              ╲                                                            ╲
import type { Cut } from './cut.ts';
import { amplitudeDb } from './decibels.ts';
import { type Turn, timesNoise, turnsAlong, usualProminenceDb } from './extrema.ts';
import { angleOnFlankDeg, flankOf, type Side } from './flank.ts';
import type { Peak } from './peak.ts';

/** Below this under the peak a flank is the wall of a null, whose steepness says nothing of shoulders. */
const deepestDb = 25;
/** 20/ln 10: a small change of amplitude, as a share of it, times this is the change in dB. */
const dbPerShare = 20 / Math.LN10;
/** How far the flank is leaned up, in shares of its mean steepness; the least that shows a shoulder counts. */
const leanShares = [1 / 8, 1 / 4, 1 / 2, 1];

export interface Shoulder {
  /** Pattern angle of its outer end in degrees, wrapped. */
  angleDeg: number;
  /** Level there in dB. */
  levelDb: number;
}

/**
 * Shoulder on a flank of the main lobe.
 *
 * The flank, from the peak to the first null, at most 25 dB down and not into the noise, is leaned up by an
 * eighth, a quarter, a half and the whole of its mean steepness. Where a leaned flank dips and rises by the
 * prominence before it falls for good, the rise is the shoulder. A flank that only ever steepens shows none
 * at any lean.
 *
 * @param cut levels in dB over degrees
 * @param peak its peak
 * @param side which flank
 * @param toOffsetDeg degrees outwards to the first null, or to the end of the cut
 * @param prominenceDb how far it must stand out, in dB
 * @param noiseDb level of the noise's rms amplitude in the unit of the cut, where it is known
 * @returns the shoulder, or undefined where the flank has none
 * Source: IEEE Std 145 (shoulder lobe); the criterion is our own.
 * Checked: tests/unit/daemon/pattern/side-lobes.test.ts.
 */
export function shoulderOn(
  cut: Cut,
  peak: Peak,
  side: Side,
  toOffsetDeg: number,
  prominenceDb: number = usualProminenceDb,
  noiseDb = Number.NEGATIVE_INFINITY,
): Shoulder | undefined {
  const flank = flankOf(cut, peak.index, side);
  const { offsetsDeg, levelDb } = flank;
  // As far down as the noise alone makes no bump of the prominence.
  const noiseMarginDb = amplitudeDb((timesNoise * dbPerShare) / prominenceDb);
  const lowestDb = Math.max(levelDb[0]! - deepestDb, noiseDb + noiseMarginDb);
  let end = 0;
  while (end + 1 < levelDb.length && offsetsDeg[end + 1]! <= toOffsetDeg && levelDb[end + 1]! >= lowestDb) {
    end += 1;
  }
  if (end < 3) return undefined;
  const meanDbPerDeg = (levelDb[0]! - levelDb[end]!) / offsetsDeg[end]!;
  if (!(meanDbPerDeg > 0)) return undefined;
  for (const share of leanShares) {
    const lean = share * meanDbPerDeg;
    const leaned = levelDb.slice(0, end + 1).map((level, k) => level + lean * offsetsDeg[k]!);
    const found = bumpOf(leaned, prominenceDb);
    if (!found) continue;
    const angleDeg = angleOnFlankDeg(flank, (offsetsDeg[found.first]! + offsetsDeg[found.last]!) / 2);
    return { angleDeg, levelDb: levelDb[found.first]! };
  }
  return undefined;
}

/** The first lobe of a leaned flank whose dip before it is as deep on the near side as well. */
function bumpOf(leaned: Float64Array, prominenceDb: number): Turn | undefined {
  const turns = turnsAlong(leaned, prominenceDb);
  for (const [k, turn] of turns.entries()) {
    const dip = turns[k - 1];
    if (turn.kind === 'null' || !dip) continue;
    // The round top of the main lobe, leaned up, rises from the first samples: no dip before it.
    const before = Math.max(...leaned.subarray(0, dip.first + 1));
    if (before - leaned[dip.first]! >= prominenceDb) return turn;
  }
  return undefined;
}
