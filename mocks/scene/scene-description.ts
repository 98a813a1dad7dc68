// What a scene is made of, as a plain object that a demo, a test or a command line can write down. Every
// field may be left out; `completeScene` fills in the defaults and refuses what makes no sense.

import type { Stacking } from './orientation.ts';
import { SceneError } from './scene-error.ts';

interface AntennaOptions {
  name?: string;
  /** Turns the whole pattern in its mount: the peak of a symmetrical antenna then stands at these angles. */
  rotateAzimuthDeg?: number;
  rotateElevationDeg?: number;
  /** Cross component below the co component, in every direction; absent: none. */
  crossPolarDb?: number;
  crossPolarPhaseDeg?: number;
  /** Heat: lowers the gain at every angle, not the directivity. */
  lossDb?: number;
}

/** Γ re 50 Ω of an antenna that is a formula; default none (a perfect match). */
interface DeclaredReflection {
  reflection?: { magnitude: number; phaseDeg: number };
}

/** `lengthScale`: every length times this, so that the antenna behaves at f as the original at f·scale. */
interface Computed {
  lengthScale?: number;
}

export type AntennaDescription = AntennaOptions &
  (
    | ({ kind: 'yagi5' } & Computed)
    | ({ kind: 'dipole' } & Computed)
    | ({ kind: 'half-wave-dipole' } & DeclaredReflection)
    | ({ kind: 'isotropic'; gainDbi?: number } & DeclaredReflection)
    /** Pure cardioid without `frontToBackDb`; gain 4.771 dBi (its directivity) unless stated. */
    | ({ kind: 'cardioid'; gainDbi?: number; frontToBackDb?: number } & DeclaredReflection)
    /** Horizontal uniform line; gain is its own directivity unless stated; a screen behind it if asked for. */
    | ({
        kind: 'line-source';
        lengthM: number;
        gainDbi?: number;
        frontToBackDb?: number;
      } & DeclaredReflection)
  );

/** A reflecting wall parallel to the line of sight; left is towards growing azimuth. */
export interface WallDescription {
  side: 'left' | 'right';
  /** From the line of sight to the wall. */
  distanceM: number;
  /** Reflection coefficient of the wall; spreading over the longer path comes on top. */
  reflectionDb: number;
  phaseDeg?: number;
}

/** An echo told by its effect rather than by its cause. */
export interface EchoDescription {
  /** Length beyond the direct path. */
  extraPathM: number;
  /** Re the direct path, if both antennas looked equally in both directions; spreading included. */
  levelDb: number;
  phaseDeg?: number;
  /** Direction it arrives from at the AUT, re the line of sight; default from straight ahead. */
  arrivalAzimuthDeg?: number;
  arrivalElevationDeg?: number;
  /** Direction it leaves the range antenna, re its line of sight; default straight ahead. */
  departureAzimuthDeg?: number;
  departureElevationDeg?: number;
}

export interface SceneDescription {
  seed?: number | string;
  antennas?: {
    aut?: AntennaDescription;
    reference?: AntennaDescription;
    range?: AntennaDescription;
  };
  /** The AUT's analyzer port; the range antenna is on the other. */
  autPort?: 1 | 2;
  stacking?: Stacking;
  /** Straight distance between the AUT's rotation axis and the range antenna. */
  rangeLengthM?: number;
  /** With it the ground reflects: heights, and the ground's reflection coefficient. */
  ground?: { rangeAntennaM: number; autM: number; reflectionMagnitude: number; reflectionPhaseDeg?: number };
  walls?: readonly WallDescription[];
  echoes?: readonly EchoDescription[];
  /** In the AUT's cable, one way; a corrected measurement does not see it. */
  cable?: { lossDb?: number; electricalLengthM?: number };
  /** Of the transmission, from the scene's start; the walk is the standard deviation after one hour. */
  drift?: { dbPerHour?: number; degPerHour?: number; walkDb?: number; walkDeg?: number };
  /**
   * Signal-to-noise power ratio of one reading at 1 kHz IF bandwidth, one average and 0 dBm. For
   * transmission the signal is the free-space S21 at `atHz` with the AUT (not the reference) mounted and all
   * axes at 0; for reflection it is |S11| = 1. The noise so fixed is the instrument's: it does not follow
   * frequency, pose or antenna; its power is proportional to IF bandwidth / (averages × source power).
   */
  noise?: { snrDb?: number; reflectionSnrDb?: number; atHz?: number };
}

/** What stands at the far end unless told: smooth over any band, as a range antenna should be. */
const usualRangeAntenna: AntennaDescription = { kind: 'cardioid', gainDbi: 8, frontToBackDb: 20 };

type Filled<T> = { [K in keyof T]-?: Exclude<T[K], undefined> };

export interface CompleteScene {
  seed: number | string;
  antennas: { aut: AntennaDescription; reference: AntennaDescription; range: AntennaDescription };
  autPort: 1 | 2;
  stacking: Stacking;
  rangeLengthM: number;
  ground: Filled<NonNullable<SceneDescription['ground']>> | undefined;
  walls: readonly WallDescription[];
  echoes: readonly EchoDescription[];
  cable: { lossDb: number; electricalLengthM: number };
  drift: { dbPerHour: number; degPerHour: number; walkDb: number; walkDeg: number };
  noise: { snrDb: number; reflectionSnrDb: number; atHz: number };
}

/** The scene with every default filled in. Throws SceneError. */
export function completeScene(description: SceneDescription = {}): CompleteScene {
  const { antennas = {}, ground } = description;
  const complete: CompleteScene = {
    seed: description.seed ?? 1,
    antennas: {
      aut: antennas.aut ?? { kind: 'yagi5' },
      reference: antennas.reference ?? { kind: 'dipole' },
      range: antennas.range ?? usualRangeAntenna,
    },
    autPort: description.autPort ?? 1,
    stacking: description.stacking ?? 'azimuth-over-elevation',
    rangeLengthM: description.rangeLengthM ?? 10,
    ground: ground && { ...ground, reflectionPhaseDeg: ground.reflectionPhaseDeg ?? 180 },
    walls: description.walls ?? [],
    echoes: description.echoes ?? [],
    cable: { lossDb: 0, electricalLengthM: 0, ...description.cable },
    drift: { dbPerHour: 0, degPerHour: 0, walkDb: 0, walkDeg: 0, ...description.drift },
    noise: { snrDb: 70, reflectionSnrDb: 80, atHz: 868e6, ...description.noise },
  };
  check(complete);
  return complete;
}

function check(scene: CompleteScene): void {
  refuseNonFinite(scene, 'scene');
  refuse(scene.rangeLengthM > 0, 'rangeLengthM must be positive', scene.rangeLengthM);
  for (const antenna of Object.values(scene.antennas)) checkAntenna(antenna);
  const ground = scene.ground;
  if (ground) {
    const { rangeAntennaM, autM } = ground;
    refuse(rangeAntennaM > 0 && autM > 0, 'heights must be above the ground', Math.min(rangeAntennaM, autM));
    refuse(
      Math.abs(rangeAntennaM - autM) < scene.rangeLengthM,
      'the heights differ by more than the range length',
      rangeAntennaM - autM,
    );
    refuse(ground.reflectionMagnitude >= 0, 'reflectionMagnitude is negative', ground.reflectionMagnitude);
  }
  for (const wall of scene.walls) refuse(wall.distanceM > 0, 'distanceM must be positive', wall.distanceM);
  for (const echo of scene.echoes) refuse(echo.extraPathM >= 0, 'extraPathM is negative', echo.extraPathM);
  refuse(scene.noise.atHz > 0, 'noise.atHz must be positive', scene.noise.atHz);
}

const kinds = ['yagi5', 'dipole', 'half-wave-dipole', 'isotropic', 'cardioid', 'line-source'];

function checkAntenna(antenna: AntennaDescription): void {
  refuse(kinds.includes(antenna.kind), 'no such kind of antenna', antenna.kind);
  if (antenna.kind === 'line-source') {
    refuse(antenna.lengthM > 0, 'lengthM must be positive', antenna.lengthM);
  }
  if ('lengthScale' in antenna && antenna.lengthScale !== undefined) {
    refuse(antenna.lengthScale > 0, 'lengthScale must be positive', antenna.lengthScale);
  }
  if ('reflection' in antenna && antenna.reflection) {
    const { magnitude } = antenna.reflection;
    refuse(magnitude >= 0 && magnitude < 1, 'a reflection must be from 0 to below 1', magnitude);
  }
}

function refuse(holds: boolean, message: string, value: string | number): void {
  if (!holds) throw new SceneError(`${message}: ${value}`, { value });
}

/** Infinity is allowed for decibels that mean "none at all", such as an endless signal-to-noise ratio. */
function refuseNonFinite(value: unknown, path: string): void {
  if (typeof value === 'number') {
    const endless = path.endsWith('Db') && value === Number.POSITIVE_INFINITY;
    if (!Number.isFinite(value) && !endless) throw new SceneError(`${path} is not a number`, { path });
  } else if (typeof value === 'object' && value !== null) {
    for (const [key, inner] of Object.entries(value)) refuseNonFinite(inner, `${path}.${key}`);
  }
}
