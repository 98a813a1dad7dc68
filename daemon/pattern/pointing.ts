// Where a beam points: the angle of its peak that noise moves least. The three-neighbour parabola is exact
// without noise and follows every wiggle with it; the curve of beam-top.ts is steady, and slightly off where
// a lobe is no polynomial of the fourth degree.
//
//      ·  ×      ·        × largest sample and its two neighbours: 1° apart their difference on a beam
//    ·‾ ‾ ‾·‾ ‾·‾ ‾·      of 60° is 0.003 dB, which noise exceeds; the curve (‾) leans on all of them
import { wrapDeg } from './angles.ts';
import type { BeamTop, CurveTop } from './beam-top.ts';
import type { Cut } from './cut.ts';
import { levelNoiseDb, type Peak } from './peak.ts';

/** What noise may do is counted to this many standard deviations. */
const deviations = 6;
/** Of some tens of samples the largest and the one at the top differ by no more than this many by noise. */
const largestDeviations = 5;

/**
 * The peak with the angle that noise moves least; index and level stay those of the peak.
 *
 * With the noise of the levels known, the curve's angle counts where both are true: the parabola's angle has
 * the larger standard deviation (slope at the vertex from three levels, over the curve's bend), and the two
 * angles are no further apart than noise explains: six such deviations, at most one step, and the stretch of
 * the top on which noise can make a sample the largest, where a parabola of that bend is five deviations of a
 * level down. Further apart, the curve does not describe the top. Without a known noise (formulae, computed patterns) the parabola's angle stands.
 *
 * @param cut levels in dB over degrees
 * @param peak its peak
 * @param top the beam's top; undefined where there is no half-power beam
 * @param floorDb the noise of a level in the unit of the cut, where it is known
 * @returns the peak, with the curve's angle and `refined` where that counts
 * Source: JCGM 100:2008, 5.1.2 (propagation), to first order; the rule is our own choice.
 * Checked: tests/unit/daemon/pattern/pointing.test.ts.
 */
export function pointing(cut: Cut, peak: Peak, top: BeamTop | undefined, floorDb?: number): Peak {
  const curve = top?.curve;
  if (peak.flat || !curve || floorDb === undefined) return peak;
  const sigmaDb = levelNoiseDb(peak.levelDb, floorDb);
  const steps = stepsBeside(cut, peak.index);
  if (!steps) return peak;
  const parabolaDeg = parabolaDegPerDb(cut, peak, steps, curve) * sigmaDb;
  if (parabolaDeg <= curve.angleDegPerDb * sigmaDb) return peak;
  const stretchDeg = Math.sqrt((2 * largestDeviations * sigmaDb) / -curve.bendDb);
  const explainedDeg = Math.min(deviations * parabolaDeg, Math.max(...steps)) + stretchDeg;
  if (Math.abs(wrapDeg(curve.angleDeg - peak.angleDeg)) > explainedDeg) return peak;
  return { index: peak.index, angleDeg: curve.angleDeg, levelDb: peak.levelDb, refined: true, flat: false };
}

/**
 * Deviation of the vertex in degrees for each dB of deviation of one level. With u the vertex from the middle
 * sample, l and r the steps beside it, the slope there weighs the three levels by
 * (2u − r)/(l(l + r)), (r − l − 2u)/(l·r) and (2u + l)/(r(l + r)); a sample that stands as it is has u = 0.
 */
function parabolaDegPerDb({ anglesDeg }: Cut, peak: Peak, steps: [number, number], curve: CurveTop): number {
  const [left, right] = steps;
  const u = peak.refined ? wrapDeg(peak.angleDeg - anglesDeg[peak.index]!) : 0;
  const weights = [
    (2 * u - right) / (left * (left + right)),
    (right - left - 2 * u) / (left * right),
    (2 * u + left) / (right * (left + right)),
  ];
  return Math.hypot(...weights) / -curve.bendDb;
}

/** Degrees to the neighbours left and right; undefined at the edge of a part of a turn. */
function stepsBeside({ anglesDeg, periodic }: Cut, index: number): [number, number] | undefined {
  const last = anglesDeg.length - 1;
  if (!periodic && (index === 0 || index === last)) return undefined;
  const before = index === 0 ? anglesDeg[last]! - 360 : anglesDeg[index - 1]!;
  const after = index === last ? anglesDeg[0]! + 360 : anglesDeg[index + 1]!;
  return [anglesDeg[index]! - before, after - anglesDeg[index]!];
}
