// One side of a pattern seen from a sample outwards, so that beamwidths, nulls and lobes are written once
// for left and right. Left is towards smaller pattern angles, right towards larger.
import { wrapDeg } from './angles.ts';
import type { Cut } from './cut.ts';

export type Side = 'left' | 'right';

export interface Flank {
  side: Side;
  /** Pattern angle of the sample it starts at, as it stands in the cut. */
  originDeg: number;
  /** Degrees from the origin, 0 first, ascending outwards. */
  offsetsDeg: Float64Array;
  levelDb: Float64Array;
  /** True when it runs round the full turn and ends at the origin again. */
  closed: boolean;
}

/**
 * A flank of a cut.
 *
 * @param cut the cut
 * @param index the sample to start at
 * @param side which way to go
 * @returns offsets and levels from that sample to the cut's end, or once round to the same sample
 */
export function flankOf(cut: Cut, index: number, side: Side): Flank {
  const count = cut.anglesDeg.length;
  const direction = side === 'right' ? 1 : -1;
  const originDeg = cut.anglesDeg[index]!;
  const outwards = side === 'right' ? count - index : index + 1;
  const length = cut.periodic ? count + 1 : outwards;
  const offsetsDeg = new Float64Array(length);
  const levelDb = new Float64Array(length);
  for (let k = 0; k < length; k += 1) {
    const place = (index + direction * k + count) % count;
    const turns = k < outwards ? 0 : 360;
    offsetsDeg[k] = direction * (cut.anglesDeg[place]! - originDeg) + turns;
    levelDb[k] = cut.levelDb[place]!;
  }
  return { side, originDeg, offsetsDeg, levelDb, closed: cut.periodic };
}

/**
 * Pattern angle at an offset along a flank.
 *
 * @param flank the flank
 * @param offsetDeg degrees from its origin
 * @returns pattern angle wrapped to (−180°, 180°]
 */
export function angleOnFlankDeg(flank: Flank, offsetDeg: number): number {
  return wrapDeg(flank.originDeg + (flank.side === 'right' ? offsetDeg : -offsetDeg));
}

/** The flank's end in words, for reasons why a figure is absent. */
export function endInWords(flank: Flank): string {
  const endDeg = flank.originDeg + (flank.side === 'right' ? 1 : -1) * (flank.offsetsDeg.at(-1) ?? 0);
  return `the cut ends at ${Number(endDeg.toFixed(2))}°`;
}
