// The questions of rf-reference.test.ts, made from one seed, and the shape of the answers.

export interface PatternQuestion {
  stepDeg: number;
  peakDeg: number;
  /** k of exp(k (cos t − 1)): the beam is about 2·acos(1 − 0.35/k) wide. */
  sharpness: number;
  /** Added fields size·exp(j·order·t). */
  harmonics: { order: number; re: number; im: number }[];
  askedDeg: number[];
}

export interface DriftQuestion {
  timesMs: number[];
  re: number[];
  im: number[];
  askedMs: number[];
}

export interface Questions {
  match: { re: number[]; im: number[] };
  patterns: PatternQuestion[];
  drifts: DriftQuestion[];
  gainTable: { frequenciesHz: number[]; gainDbi: number[]; askedHz: number[] };
}

export interface WidthAnswer {
  widthDeg: number;
  chordErrorDeg: number;
  degPerDb: number;
}

export interface PatternAnswer {
  anglesDeg: number[];
  levelDb: number[];
  peakDeg: number;
  peakDb: number;
  /** Third over second derivative of the level at the peak, per degree. */
  skewness: number;
  oppositeDb: number;
  oppositeSlope: number;
  oppositeBend: number;
  halfPower: WidthAnswer | null;
  tenDb: WidthAnswer | null;
  vertexDeg: number;
  vertexDb: number;
  straightLeftDeg: number;
  straightRightDeg: number;
  straightDb: number[];
}

export interface Answers {
  versions: Record<string, string>;
  match: Record<'vswr' | 'returnLossDb' | 'mismatchLossDb' | 'resistanceOhm' | 'reactanceOhm', number[]>;
  patterns: PatternAnswer[];
  drifts: { re: number[]; im: number[]; driftDb: number; turnDeg: number }[];
  gainTable: number[];
}

export function askQuestions(seed: number): Questions {
  const random = uniform(seed);
  const between = (low: number, high: number) => low + (high - low) * random();
  const list = <T>(length: number, make: (k: number) => T) => Array.from({ length }, (_, k) => make(k));
  const ascending = (length: number, from: number, least: number, most: number) => {
    let at = from;
    return list(length, () => {
      at += between(least, most);
      return at;
    });
  };

  // From a nearly perfect match to a nearly total reflection, evenly in decibels and evenly in size.
  const gammas = list(500, (k) => {
    const size = k % 2 === 0 ? 10 ** between(-3, -0.02) : between(0.01, 0.98);
    const angle = between(-Math.PI, Math.PI);
    return [size * Math.cos(angle), size * Math.sin(angle)] as const;
  });
  const pattern = (): PatternQuestion => ({
    stepDeg: 1,
    peakDeg: between(-180, 180),
    sharpness: between(1.5, 20),
    harmonics: list(7, (k) => ({ order: k - 3, re: between(-0.02, 0.02), im: between(-0.02, 0.02) })),
    askedDeg: list(20, () => between(-400, 400)),
  });
  const drift = (): DriftQuestion => {
    const timesMs = ascending(20, 1000, 20_000, 90_000);
    let angle = between(-Math.PI, Math.PI);
    const trend = between(-0.6, 0.6);
    const ties = timesMs.map(() => {
      const size = 10 ** between(-2.1, -1.9);
      // Below the 60° between ties from which it is refused.
      angle += trend + between(-0.4, 0.4);
      return [size * Math.cos(angle), size * Math.sin(angle)] as const;
    });
    return {
      timesMs,
      re: ties.map(([re]) => re),
      im: ties.map(([, im]) => im),
      askedMs: [0, timesMs.at(-1)! + 5000, timesMs[3]!, ...list(20, () => between(0, timesMs.at(-1)!))],
    };
  };
  const frequenciesHz = ascending(9, 800e6, 1e6, 20e6);
  return {
    match: { re: gammas.map(([re]) => re), im: gammas.map(([, im]) => im) },
    patterns: list(60, pattern),
    drifts: list(40, drift),
    gainTable: {
      frequenciesHz,
      gainDbi: frequenciesHz.map(() => between(-2, 14)),
      askedHz: [
        frequenciesHz[0]!,
        frequenciesHz.at(-1)!,
        ...list(50, () => between(frequenciesHz[0]!, frequenciesHz.at(-1)!)),
      ],
    },
  };
}

/** Even numbers from 0 to 1: a multiplicative sequence modulo 2³¹ − 1 (Park and Miller, CACM 1988). */
function uniform(seed: number): () => number {
  let state = seed % 2147483647;
  return () => {
    state = (state * 16807) % 2147483647;
    return state / 2147483647;
  };
}
