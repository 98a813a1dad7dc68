// A shoulder: a side lobe that has run into the main lobe, with no null between. The flank keeps falling,
// only less steeply for a while.
//
//   level ╲                 leaned up by half the mean steepness:   ╲    ╱╲
//          ╲___ shoulder                                             ╲__╱  ╲
//              ╲                                                            ╲
import type { Cut } from './cut.ts';
import { turnsAlong, usualProminenceDb } from './extrema.ts';
import { angleOnFlankDeg, flankOf, type Side } from './flank.ts';
import type { Peak } from './peak.ts';

/** Below this under the peak a flank is the wall of a null, whose steepness says nothing of shoulders. */
const deepestDb = 40;

export interface Shoulder {
  /** Pattern angle of its outer end in degrees, wrapped. */
  angleDeg: number;
  /** Level there in dB. */
  levelDb: number;
}

/**
 * Shoulder on a flank of the main lobe.
 *
 * The flank, from the peak to the first null and at most 40 dB down, is leaned up by half its mean
 * steepness. Where that leaned flank dips and rises by the prominence before it falls for good, the rise is
 * the shoulder.
 *
 * @param cut levels in dB over degrees
 * @param peak its peak
 * @param side which flank
 * @param toOffsetDeg degrees outwards to the first null, or to the end of the cut
 * @param prominenceDb how far it must stand out, in dB
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
): Shoulder | undefined {
  const flank = flankOf(cut, peak.index, side);
  const { offsetsDeg, levelDb } = flank;
  let end = 0;
  while (
    end + 1 < levelDb.length &&
    offsetsDeg[end + 1]! <= toOffsetDeg &&
    levelDb[end + 1]! >= levelDb[0]! - deepestDb
  ) {
    end += 1;
  }
  if (end < 3) return undefined;
  const lean = (levelDb[0]! - levelDb[end]!) / offsetsDeg[end]! / 2;
  if (!(lean > 0)) return undefined;
  const leaned = levelDb.slice(0, end + 1).map((level, k) => level + lean * offsetsDeg[k]!);
  const turns = turnsAlong(leaned, prominenceDb);
  // Leaned up, the round top of the lobe itself rises from the first sample: not a shoulder.
  const beyondTop = turns[0]?.first === 0 ? turns.slice(2) : turns;
  const found = beyondTop.find((turn) => turn.kind === 'lobe');
  if (!found) return undefined;
  const angleDeg = angleOnFlankDeg(flank, (offsetsDeg[found.first]! + offsetsDeg[found.last]!) / 2);
  return { angleDeg, levelDb: levelDb[found.first]! };
}
