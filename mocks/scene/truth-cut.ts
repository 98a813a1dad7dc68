// The true figures of one cut, from a level that can be asked at any angle: a fine scan finds where to look,
// then sections and bisections find the place. No samples, no interpolation between them. For tests alone.

export interface Absent {
  kind: 'absent';
  because: string;
}

export interface Lobe {
  angleDeg: number;
  /** Re the peak of the cut; negative. */
  levelDb: number;
}

export interface CutTruth {
  peakDeg: number;
  /** Realized gain at the cut's peak and at angle 0. */
  realizedGainDbi: number;
  gainAtZeroDbi: number;
  /** Left is towards lower angles. */
  halfPowerLeftDeg: number | Absent;
  halfPowerRightDeg: number | Absent;
  halfPowerBeamwidthDeg: number | Absent;
  /** Peak over the level at peak + 180°. */
  frontToBackDb: number;
  /** Peak over the highest level within peak + 180° ± 60°. */
  frontToRearDb: number;
  firstSideLobeLeft: Lobe | Absent;
  firstSideLobeRight: Lobe | Absent;
  /** Highest minus lowest level of the scan. */
  rangeDb: number;
}

/** 0.05°: finer than any lobe of an antenna shorter than some hundred wavelengths. */
const scanSteps = 7200;
/** Levels nearer than this are one level. */
const alikeDb = 1e-9;
const halfPowerDb = -10 * Math.log10(2);

/** `levelDbi` is periodic in 360°. */
export function truthOfCut(levelDbi: (angleDeg: number) => number): CutTruth {
  const levels = Float64Array.from({ length: scanSteps }, (_, i) => levelDbi(angleOf(i)));
  const highest = levels.reduce((a, b) => Math.max(a, b));
  const lowest = levels.reduce((a, b) => Math.min(a, b));
  const top = nearestToZero(levels, highest - alikeDb);
  const flat = highest - lowest < 1e-6;
  const peakDeg = flat ? 0 : section(levelDbi, angleOf(top - 1), angleOf(top + 1));
  const peak = levelDbi(peakDeg);
  const left = crossing(levelDbi, levels, top, peakDeg, peak, -1);
  const right = crossing(levelDbi, levels, top, peakDeg, peak, 1);
  return {
    peakDeg: wrapDegrees(peakDeg),
    realizedGainDbi: peak,
    gainAtZeroDbi: levelDbi(0),
    halfPowerLeftDeg: left,
    halfPowerRightDeg: right,
    halfPowerBeamwidthDeg:
      typeof left === 'number' && typeof right === 'number'
        ? right - left
        : { kind: 'absent', because: 'does not fall to half power on both sides' },
    frontToBackDb: peak - levelDbi(peakDeg + 180),
    frontToRearDb: peak - highestWithin(levelDbi, peakDeg + 120, peakDeg + 240),
    firstSideLobeLeft: firstSideLobe(levelDbi, levels, top, peak, -1),
    firstSideLobeRight: firstSideLobe(levelDbi, levels, top, peak, 1),
    rangeDb: highest - lowest,
  };
}

/** Of peaks that are alike the one nearest to angle 0, so that rounding does not choose. */
function nearestToZero(levels: Float64Array, thresholdDbi: number): number {
  for (let step = 0; step <= scanSteps / 2; step++) {
    for (const index of [step, -step]) if (at(levels, index) >= thresholdDbi) return index;
  }
  return 0;
}

function angleOf(index: number): number {
  return (index * 360) / scanSteps;
}

/** (−180, 180]. */
export function wrapDegrees(angleDeg: number): number {
  const wrapped = angleDeg - 360 * Math.floor(angleDeg / 360);
  return wrapped > 180 ? wrapped - 360 : wrapped;
}

/** Place of the one maximum between two angles (golden section). */
function section(level: (angleDeg: number) => number, fromDeg: number, toDeg: number): number {
  const ratio = (Math.sqrt(5) - 1) / 2;
  let [a, b] = [fromDeg, toDeg];
  while (b - a > 1e-7) {
    const c = b - ratio * (b - a);
    const d = a + ratio * (b - a);
    if (level(c) > level(d)) b = d;
    else a = c;
  }
  return (a + b) / 2;
}

/** First place on one side where the level falls through half power, unwrapped from the peak. */
function crossing(
  level: (angleDeg: number) => number,
  levels: Float64Array,
  top: number,
  peakDeg: number,
  peak: number,
  side: 1 | -1,
): number | Absent {
  const threshold = peak + halfPowerDb;
  for (let step = 1; step < scanSteps; step++) {
    if (at(levels, top + side * step) > threshold) continue;
    let above = step === 1 ? peakDeg : angleOf(top + side * (step - 1));
    let below = angleOf(top + side * step);
    while (Math.abs(above - below) > 1e-9) {
      const middle = (above + below) / 2;
      if (level(middle) > threshold) above = middle;
      else below = middle;
    }
    return (above + below) / 2;
  }
  return { kind: 'absent', because: 'never falls to half power' };
}

function highestWithin(level: (angleDeg: number) => number, fromDeg: number, toDeg: number): number {
  const steps = Math.round((toDeg - fromDeg) * 20);
  const stepDeg = (toDeg - fromDeg) / steps;
  let best = 0;
  for (let i = 1; i <= steps; i++) {
    if (level(fromDeg + i * stepDeg) > level(fromDeg + best * stepDeg)) best = i;
  }
  const bestDeg = fromDeg + best * stepDeg;
  const low = Math.max(fromDeg, bestDeg - stepDeg);
  const high = Math.min(toDeg, bestDeg + stepDeg);
  return Math.max(level(fromDeg), level(toDeg), level(bestDeg), level(section(level, low, high)));
}

/** Down from the peak to the first minimum, then up to the next maximum, whatever its height. */
function firstSideLobe(
  level: (angleDeg: number) => number,
  levels: Float64Array,
  top: number,
  peak: number,
  side: 1 | -1,
): Lobe | Absent {
  const absent: Absent = { kind: 'absent', because: 'no second lobe' };
  let step = 1;
  while (step < scanSteps && at(levels, top + side * step) < at(levels, top + side * (step - 1))) step += 1;
  const minimum = step;
  while (step < scanSteps && at(levels, top + side * step) > at(levels, top + side * (step - 1))) step += 1;
  const lobe = top + side * (step - 1);
  const rise = at(levels, lobe) - at(levels, top + side * (minimum - 1));
  if (step >= scanSteps - 1 || rise < 1e-6) return absent;
  const angleDeg = section(level, angleOf(lobe - 1), angleOf(lobe + 1));
  return { angleDeg: wrapDegrees(angleDeg), levelDb: level(angleDeg) - peak };
}

function at(levels: Float64Array, index: number): number {
  return levels[((index % scanSteps) + scanSteps) % scanSteps]!;
}
