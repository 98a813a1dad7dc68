// Decibels and ratios, for power and for amplitude (field, voltage, S-parameter). Nothing here knows what
// the ratio is of. A ratio of zero has no decibels; it is held at a level no instrument reaches.
import { PatternError } from './pattern-error.ts';

/** 10 log 2: the drop to half power. Closed form; handbooks round it to 3 dB. */
export const halfPowerDb = 10 * Math.log10(2);

/** Where the level of a zero is held, in dB: far below what any receiver resolves, so that it stays a number. */
export const lowestLevelDb = -400;

/** No decibel value beyond ±this is taken for a level; its ratio would leave the range of the numbers. */
export const largestLevelDb = 1000;

/**
 * Level of a power ratio.
 *
 * @param ratio power ratio, 0 or more
 * @returns 10 log10(ratio) in dB, not below `lowestLevelDb`
 * @throws PatternError for a negative or non-finite ratio
 * Source: IEC 60027-3 (logarithmic quantities). Checked: tests/outside, I-TABLE, I-MINUS3.
 */
export function powerDb(ratio: number): number {
  return Math.max(lowestLevelDb, 10 * Math.log10(ratioOf('power ratio', ratio)));
}

/**
 * Level of an amplitude ratio.
 *
 * @param ratio amplitude ratio, 0 or more
 * @returns 20 log10(ratio) in dB, not below `lowestLevelDb`
 * @throws PatternError for a negative or non-finite ratio
 * Source: IEC 60027-3. Checked: tests/outside, I-TABLE.
 */
export function amplitudeDb(ratio: number): number {
  return Math.max(lowestLevelDb, 20 * Math.log10(ratioOf('amplitude ratio', ratio)));
}

/**
 * Power ratio of a level.
 *
 * @param levelDb level in dB, within ±`largestLevelDb`
 * @returns 10^(levelDb/10)
 * @throws PatternError outside that range
 * Source: IEC 60027-3. Checked: tests/outside, I-TABLE, I-DBM.
 */
export function powerRatio(levelDb: number): number {
  return 10 ** (checkedLevelDb(levelDb) / 10);
}

/**
 * Amplitude ratio of a level.
 *
 * @param levelDb level in dB, within ±`largestLevelDb`
 * @returns 10^(levelDb/20)
 * @throws PatternError outside that range
 * Source: IEC 60027-3. Checked: tests/outside, I-TABLE.
 */
export function amplitudeRatio(levelDb: number): number {
  return 10 ** (checkedLevelDb(levelDb) / 20);
}

/**
 * Levels of a complex trace, such as S21 over frequency or over angle.
 *
 * @param trace interleaved re, im, length 2N, dimensionless
 * @returns N levels 20 log10|value| in dB, not below `lowestLevelDb`
 * @throws PatternError for an odd length or a value that is no finite number
 */
export function traceLevelDb(trace: Float64Array): Float64Array {
  if (trace.length % 2 !== 0) {
    throw new PatternError(`The trace has ${trace.length} numbers; hand in pairs of re and im.`, {
      length: trace.length,
    });
  }
  const levels = new Float64Array(trace.length / 2);
  for (let k = 0; k < levels.length; k += 1) {
    levels[k] = amplitudeDb(Math.hypot(trace[2 * k]!, trace[2 * k + 1]!));
  }
  return levels;
}

function checkedLevelDb(levelDb: number): number {
  if (Math.abs(levelDb) <= largestLevelDb) return levelDb;
  throw new PatternError(`A level of ${levelDb} dB is no level; expected within ±${largestLevelDb} dB.`, {
    levelDb: String(levelDb),
  });
}

function ratioOf(name: string, ratio: number): number {
  if (ratio >= 0 && ratio < Number.POSITIVE_INFINITY) return ratio;
  throw new PatternError(`The ${name} is ${ratio}; hand in a finite number of 0 or more.`, {
    name,
    value: String(ratio),
  });
}
