// What a scene's antenna truly does, for tests to compare a measurement against: free of echoes, drift and
// noise, found by its own methods. It never goes over a wire to the daemon.
import { squaredMagnitude } from './complex.ts';
import type { Pose } from './pose.ts';
import type { Mounted, Scene } from './scene.ts';
import { meet } from './transmission.ts';
import { type CutTruth, truthOfCut } from './truth-cut.ts';

export interface FrequencyTruth {
  frequencyHz: number;
  azimuth: CutTruth;
  elevation: CutTruth;
  /** Mismatch loss taken out again: IEEE gain at the azimuth cut's peak. */
  gainDbi: number;
  reflection: { re: number; im: number };
  returnLossDb: number;
  vswr: number;
}

export interface MatchTruth {
  /** Where |S11| is least within the band; undefined when it is the same everywhere. */
  bestMatchHz: number | undefined;
  /** Where the reactance crosses zero going up; absent when it does not within the band. */
  resonanceHz: number | undefined;
}

/** The true realized gain of an antenna on the mast towards the range antenna, in dBi, at one pose. */
export function realizedGainDbi(scene: Scene, which: Mounted, frequencyHz: number): (pose: Pose) => number {
  const mounted = scene.antennas[which];
  const onGrid = mounted.antenna.onGrid(Float64Array.of(frequencyHz));
  const accepted = 1 - squaredMagnitude(mounted.antenna.reflection(frequencyHz));
  const field = new Float64Array(2);
  return (pose) => {
    const { azimuthDeg, elevationDeg, vertical } = meet(
      straightWave,
      pose,
      mounted,
      scene.description.stacking,
    );
    onGrid.fieldAt(field, 0, azimuthDeg, elevationDeg);
    const share = vertical[0] ** 2 + vertical[1] ** 2;
    const gain = (field[0]! ** 2 + field[1]! ** 2) * share * accepted * mounted.lossFactor ** 2;
    return 10 * Math.log10(Math.max(gain, 1e-20));
  };
}

/** A vertical wave along the line of sight. */
const straightWave = { arrival: [1, 0, 0], vertical: [0, 0, 1], horizontal: [0, 1, 0] } as const;

/** True figures of both cuts and the match at one frequency; the other axis stands at its given angle. */
export function truthAt(
  scene: Scene,
  frequencyHz: number,
  which: Mounted = 'aut',
  fixed: { azimuthDeg?: number; elevationDeg?: number; rollDeg?: number } = {},
): FrequencyTruth {
  const level = realizedGainDbi(scene, which, frequencyHz);
  const { azimuthDeg = 0, elevationDeg = 0, rollDeg = 0 } = fixed;
  const azimuth = truthOfCut((angleDeg) => level({ azimuthDeg: angleDeg, elevationDeg, rollDeg }));
  const elevation = truthOfCut((angleDeg) => level({ azimuthDeg, elevationDeg: angleDeg, rollDeg }));
  const reflection = scene.antennas[which].antenna.reflection(frequencyHz);
  const power = squaredMagnitude(reflection);
  const magnitude = Math.sqrt(power);
  return {
    frequencyHz,
    azimuth,
    elevation,
    gainDbi: azimuth.realizedGainDbi - 10 * Math.log10(1 - power),
    reflection,
    returnLossDb: -10 * Math.log10(power),
    vswr: (1 + magnitude) / (1 - magnitude),
  };
}

/** True match over a band, on a 10 kHz raster refined by sections and bisection. */
export function matchTruth(
  scene: Scene,
  startHz: number,
  stopHz: number,
  which: Mounted = 'aut',
): MatchTruth {
  const antenna = scene.antennas[which].antenna;
  const power = (frequencyHz: number): number => squaredMagnitude(antenna.reflection(frequencyHz));
  const reactive = (frequencyHz: number): number => antenna.reflection(frequencyHz).im;
  const steps = Math.ceil((stopHz - startHz) / 10_000);
  const frequencyOf = (i: number): number => startHz + ((stopHz - startHz) * i) / steps;
  let best = 0;
  let worst = 0;
  let rising: number | undefined;
  for (let i = 1; i <= steps; i++) {
    if (power(frequencyOf(i)) < power(frequencyOf(best))) best = i;
    if (power(frequencyOf(i)) > power(frequencyOf(worst))) worst = i;
    if (rising === undefined && reactive(frequencyOf(i - 1)) < 0 && reactive(frequencyOf(i)) >= 0) rising = i;
  }
  return {
    bestMatchHz:
      best === worst
        ? undefined
        : leastBetween(power, frequencyOf(Math.max(0, best - 1)), frequencyOf(Math.min(steps, best + 1))),
    resonanceHz:
      rising === undefined ? undefined : zeroBetween(reactive, frequencyOf(rising - 1), frequencyOf(rising)),
  };
}

function leastBetween(value: (x: number) => number, from: number, to: number): number {
  let [a, b] = [from, to];
  while (b - a > 1) {
    const [c, d] = [a + (b - a) / 3, b - (b - a) / 3];
    if (value(c) < value(d)) b = d;
    else a = c;
  }
  return (a + b) / 2;
}

function zeroBetween(value: (x: number) => number, below: number, above: number): number {
  let [a, b] = [below, above];
  while (b - a > 1) {
    const middle = (a + b) / 2;
    if (value(middle) < 0) a = middle;
    else b = middle;
  }
  return (a + b) / 2;
}
