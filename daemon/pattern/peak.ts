// The peak of a cut: its largest level, placed between the samples where the neighbours allow it.
import { wrapDeg } from './angles.ts';
import type { Cut } from './cut.ts';
import { amplitudeRatio, lowestLevelDb } from './decibels.ts';
import { parabolaVertex } from './parabola.ts';

/** A parabola that lifts the largest sample by more than this is no lobe's top: too few samples, or a jump. */
export const largestLiftDb = 1;

/** Levels that differ by no more than this round the whole cut have no peak, however little noise there is. */
const flatDb = 1e-9;
/** Largest minus least of some hundred noisy levels: 361 Gaussian ones span 6 standard deviations or so. */
const noiseSpan = 8;

export interface Peak {
  /** The largest sample; the middle one of several equal neighbours. */
  index: number;
  /** Pattern angle of the peak in degrees, refined, wrapped to (−180°, 180°]. */
  angleDeg: number;
  /** Level of the peak in dB, refined. */
  levelDb: number;
  /** True when the parabola was used. */
  refined: boolean;
  /** Why it was not used. */
  because?: string;
  /** True when all levels are the same: then the angle means nothing. */
  flat: boolean;
}

/**
 * Peak of a cut: the largest level, refined by a parabola through three neighbours in dB.
 *
 * Unequal steps are allowed; a full turn wraps. The sample stands as it is, and `because` says so, at the
 * edge of a part of a turn, where three or more neighbours share the largest level (their middle is taken),
 * and where the parabola would lift the level by more than `largestLiftDb`. On a wide beam noise moves this
 * angle by degrees: where the noise is known, figures take theirs from `pointing`.
 *
 * @param cut levels in dB over degrees
 * @param floorDb the range's floor in the unit of the levels, where it is known: differences that its noise
 *   alone makes are none
 * @returns the peak; always there, `flat` when no direction is stronger than another
 * Source: IEEE Std 145 (major lobe, direction of maximum); parabola: common practice.
 * Checked: tests/outside (A-DIP-LENGTH peak angles), tests/unit/daemon/pattern/peak.test.ts.
 */
export function peakOf(cut: Cut, floorDb?: number): Peak {
  const { anglesDeg, levelDb } = cut;
  let largest = 0;
  let least = 0;
  for (let k = 1; k < levelDb.length; k += 1) {
    if (levelDb[k]! > levelDb[largest]!) largest = k;
    if (levelDb[k]! < levelDb[least]!) least = k;
  }
  const noiseDb = floorDb === undefined ? 0 : levelNoiseDb(levelDb[largest]!, floorDb);
  if (levelDb[largest]! - levelDb[least]! <= Math.max(flatDb, noiseSpan * noiseDb)) {
    return unrefined(cut, largest, 'the level is the same in all directions', true);
  }
  const plateau = plateauAround(cut, largest);
  if (plateau.length >= 3) {
    const index = plateau.indices[plateau.length >> 1]!;
    return unrefined(cut, index, `${plateau.length} neighbours share the largest level`, false);
  }
  return refinedAt(cut, plateau.indices[0] ?? largest, anglesDeg.length);
}

/**
 * Standard deviation of a level that stands over additive complex noise: 8.686 dB × n/(√2·a) for small n/a.
 *
 * @param levelDb the level in dB
 * @param floorDb level of the noise's rms amplitude in the same unit
 * @returns standard deviation in dB; that of equal amplitudes when the noise is the stronger
 * Source: first order in n/a, closed form. Checked: tests/unit/daemon/pattern/pointing.test.ts.
 */
export function levelNoiseDb(levelDb: number, floorDb: number): number {
  return (
    (20 / Math.LN10) * (amplitudeRatio(Math.max(lowestLevelDb, Math.min(0, floorDb - levelDb))) / Math.SQRT2)
  );
}

/**
 * Refines a local maximum as the peak is refined: side lobes and rear lobes use it.
 *
 * @param cut levels in dB over degrees
 * @param index a sample no lower than both its neighbours
 * @returns angle and level of that maximum, with `because` where the sample stands as it is
 */
export function refinedMaximum(cut: Cut, index: number): Peak {
  return refinedAt(cut, index, cut.anglesDeg.length);
}

function refinedAt(cut: Cut, index: number, count: number): Peak {
  const { anglesDeg, levelDb, periodic } = cut;
  const atEdge = index === 0 || index === count - 1;
  if (atEdge && !periodic) return unrefined(cut, index, 'it lies at the edge of the cut', false);
  const before = (index + count - 1) % count;
  const after = (index + 1) % count;
  const vertex = parabolaVertex(
    anglesDeg[before]! - (index === 0 ? 360 : 0),
    levelDb[before]!,
    anglesDeg[index]!,
    levelDb[index]!,
    anglesDeg[after]! + (index === count - 1 ? 360 : 0),
    levelDb[after]!,
  );
  if (!vertex) return unrefined(cut, index, 'its neighbours are as strong', false);
  if (vertex.y - levelDb[index]! > largestLiftDb) {
    return unrefined(cut, index, 'the samples are too far apart for its shape', false);
  }
  return { index, angleDeg: wrapDeg(vertex.x), levelDb: vertex.y, refined: true, flat: false };
}

function unrefined(cut: Cut, index: number, because: string, flat: boolean): Peak {
  const angleDeg = wrapDeg(cut.anglesDeg[index]!);
  return { index, angleDeg, levelDb: cut.levelDb[index]!, refined: false, because, flat };
}

/** Neighbours of the same level, in order of angle. */
function plateauAround(cut: Cut, index: number): { indices: number[]; length: number } {
  const count = cut.levelDb.length;
  const same = (k: number) => cut.levelDb[k] === cut.levelDb[index];
  const indices = [index];
  const next = (k: number, step: number) => {
    const to = k + step;
    return cut.periodic ? (to + count) % count : to;
  };
  for (let k = next(index, -1); k >= 0 && same(k) && indices.length < count; k = next(k, -1))
    indices.unshift(k);
  for (let k = next(index, 1); k < count && same(k) && indices.length < count; k = next(k, 1))
    indices.push(k);
  return { indices, length: indices.length };
}
