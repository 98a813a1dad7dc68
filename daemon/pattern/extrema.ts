// Nulls and lobes of a cut in the order they come, outwards from the peak. A dip or a rise counts only when
// it stands out by the stated prominence, so that noise makes no lobes.
//
//   peak ╲        ╱╲  lobe                  falling: keep the lowest sample; a rise of the prominence
//         ╲      ╱  ╲      ╱                         above it confirms a null
//          ╲    ╱    ╲    ╱                 rising:  keep the highest; a fall of the prominence
//           ╲╱ null   ╲╱ null                        below it confirms a lobe
import type { Cut } from './cut.ts';
import { amplitudeRatio, lowestLevelDb } from './decibels.ts';
import { angleOnFlankDeg, type Flank, flankOf } from './flank.ts';
import { parabolaVertex } from './parabola.ts';
import { finite, PatternError } from './pattern-error.ts';
import { largestLiftDb, type Peak } from './peak.ts';

/** A lobe or null stands out by at least this much on both sides, unless the caller says otherwise. */
export const usualProminenceDb = 1;

/**
 * And by this many times the noise's rms amplitude, where the noise is known: nearly six standard deviations of
 * one sample's magnitude, when the largest and least of fifty samples lie four and a half apart.
 */
export const timesNoise = 4;

export interface Extremum {
  kind: 'null' | 'lobe';
  /** Pattern angle in degrees, refined, wrapped. */
  angleDeg: number;
  /** Level in dB: lobes refined by a parabola, nulls as sampled. */
  levelDb: number;
  /** Degrees outwards from the peak's sample. */
  offsetDeg: number;
}

export interface Extrema {
  /** In order outwards from the peak; on a full turn both hold all of them, from either end. */
  left: Extremum[];
  right: Extremum[];
  periodic: boolean;
  prominenceDb: number;
  /** As it was handed in. */
  noiseDb?: number;
}

export interface ExtremaOptions {
  /** Smallest rise and fall beside a lobe or null, in dB; `usualProminenceDb` unless given. */
  prominenceDb?: number;
  /** Levels at or below this are not told apart, in dB; everything counts unless given. */
  resolvedDb?: number;
  /** Level of the noise's rms amplitude, in the unit of the cut, where it is known. */
  noiseDb?: number;
}

/**
 * Nulls and lobes of a cut on both sides of its peak.
 *
 * A null lies where the amplitude, falling and rising linearly beside it, reaches zero; a shallow one at the
 * vertex of a parabola in dB; a flat one (held at the floor) in its middle. At the edge of a part of a turn
 * the last rise or fall is neither.
 *
 * @param cut levels in dB over degrees
 * @param peak its peak
 * @param options prominence and the lowest resolved level in dB
 * @returns nulls and lobes in turn, a null first, on each side
 * @throws PatternError for a prominence that is not above zero
 * Source: IEEE Std 145 (minor lobe, null); prominence: common practice.
 * Checked: tests/outside (A-LINE-SLL, A-LINE-FNBW, A-TAPER, A-CIRC-SLL, NEC cuts).
 */
export function extremaOf(cut: Cut, peak: Peak, options: ExtremaOptions = {}): Extrema {
  const prominenceDb = finite('prominenceDb', options.prominenceDb ?? usualProminenceDb);
  if (prominenceDb <= 0) {
    throw new PatternError(`A prominence of ${prominenceDb} dB; hand in a number above zero.`, {
      prominenceDb,
    });
  }
  const along = (side: 'left' | 'right') => {
    const flank = flankOf(cut, peak.index, side);
    const held = heldAt(flank.levelDb, options.resolvedDb);
    return turnsAlong(held, prominenceDb, options.noiseDb).map((turn) => placed(flank, turn));
  };
  const right = along('right');
  const left = cut.periodic
    ? right.map((found) => ({ ...found, offsetDeg: 360 - found.offsetDeg })).reverse()
    : along('left');
  const found = { left, right, periodic: cut.periodic, prominenceDb };
  return options.noiseDb === undefined ? found : { ...found, noiseDb: options.noiseDb };
}

/** Where a row of levels turns: samples `first` to `last` share the extreme level. */
export interface Turn {
  kind: 'null' | 'lobe';
  first: number;
  last: number;
}

/**
 * Alternating nulls and lobes of a row of levels that starts at a maximum.
 *
 * @param levelDb levels in dB in order
 * @param prominenceDb smallest rise and fall in dB
 * @param noiseDb level of the noise's rms amplitude: a rise or fall must also exceed it several times
 * @returns turns in order, a null first
 */
export function turnsAlong(levelDb: Float64Array, prominenceDb: number, noiseDb?: number): Turn[] {
  const turns: Turn[] = [];
  const amplitude = (level: number) => amplitudeRatio(Math.max(lowestLevelDb, level - levelDb[0]!));
  const margin = noiseDb === undefined ? 0 : timesNoise * amplitude(Math.min(noiseDb, levelDb[0]!));
  let kind: Turn['kind'] = 'null';
  let first = 0;
  let last = 0;
  for (let k = 1; k < levelDb.length; k += 1) {
    // Positive when the level goes further the way it went: down towards a null, up towards a lobe.
    const further = (kind === 'null' ? -1 : 1) * (levelDb[k]! - levelDb[first]!);
    if (further > 0) first = k;
    if (further >= 0) last = k;
    if (-further < prominenceDb) continue;
    if (margin > 0 && Math.abs(amplitude(levelDb[k]!) - amplitude(levelDb[first]!)) < margin) continue;
    turns.push({ kind, first, last });
    kind = kind === 'null' ? 'lobe' : 'null';
    first = k;
    last = k;
  }
  return turns;
}

function heldAt(levelDb: Float64Array, resolvedDb: number | undefined): Float64Array {
  return resolvedDb === undefined ? levelDb : levelDb.map((level) => Math.max(level, resolvedDb));
}

function placed(flank: Flank, turn: Turn): Extremum {
  const { offsetsDeg, levelDb } = flank;
  const at = turn.first === turn.last ? spot(flank, turn) : undefined;
  const offsetDeg = at?.x ?? (offsetsDeg[turn.first]! + offsetsDeg[turn.last]!) / 2;
  return {
    kind: turn.kind,
    angleDeg: angleOnFlankDeg(flank, offsetDeg),
    levelDb: turn.kind === 'lobe' ? (at?.y ?? levelDb[turn.first]!) : levelDb[turn.first]!,
    offsetDeg,
  };
}

function spot(
  { offsetsDeg, levelDb }: Flank,
  { kind, first: k }: Turn,
): { x: number; y: number } | undefined {
  if (k === 0 || k === levelDb.length - 1) return undefined;
  const [x0, x1, x2] = [offsetsDeg[k - 1]!, offsetsDeg[k]!, offsetsDeg[k + 1]!];
  const [y0, y1, y2] = [levelDb[k - 1]!, levelDb[k]!, levelDb[k + 1]!];
  if (kind === 'null' && Math.min(y0, y2) - y1 > largestLiftDb) return deepNull([x0, x1, x2], [y0, y1, y2]);
  const vertex = parabolaVertex(x0, y0, x1, y1, x2, y2);
  return vertex && Math.abs(vertex.y - y1) <= largestLiftDb ? vertex : undefined;
}

/**
 * A null between samples: the signed amplitude runs through zero on one side of the lowest sample; that side
 * on which the slope is the steadier.
 */
function deepNull(x: [number, number, number], levelDb: [number, number, number]): { x: number; y: number } {
  const strongestDb = Math.max(...levelDb);
  const [before, lowest, after] = levelDb.map((level) =>
    amplitudeRatio(Math.max(lowestLevelDb, level - strongestDb)),
  ) as [number, number, number];
  const [left, right] = [x[1] - x[0], x[2] - x[1]];
  const unevenIfRight = Math.abs((before - lowest) / left - (lowest + after) / right);
  const unevenIfLeft = Math.abs((before + lowest) / left - (after - lowest) / right);
  const shift =
    unevenIfRight < unevenIfLeft ? (right * lowest) / (lowest + after) : (-left * lowest) / (lowest + before);
  return { x: x[1] + shift, y: levelDb[1] };
}
