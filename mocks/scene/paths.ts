// The ways a wave takes between the two antennas: straight, off the ground, off walls, and echoes told by
// their effect. Each with its own length, so that each has its true delay.
//
//          range antenna o───────── direct ─────────o AUT        x of the range frame: AUT → range antenna
//                         ╲                        ╱             elevations here are re the line of sight
//          ───────────────── ╲ ──── ground ──── ╱ ──────
import { type Complex, fromPolar } from './complex.ts';
import { azimuthTurn, elevationTurn, turn, type Vector } from './orientation.ts';
import type { CompleteScene, EchoDescription, WallDescription } from './scene-description.ts';

export interface Path {
  lengthM: number;
  /** Amplitude re the direct path before either antenna's pattern; spreading included, delay not. */
  amplitude: Complex;
  /** At the AUT, in the range frame: where the wave comes from, and its vertical and horizontal vectors. */
  arrival: Vector;
  vertical: Vector;
  horizontal: Vector;
  /** At the range antenna, in that antenna's frame at roll 0. */
  departure: Vector;
}

interface Ends {
  arrivalAzimuthDeg: number;
  arrivalElevationDeg: number;
  departureAzimuthDeg: number;
  departureElevationDeg: number;
}

/** All paths of the scene, the direct one first. */
export function pathsOf(scene: CompleteScene): Path[] {
  const straight = pathBetween(scene.rangeLengthM, { re: 1, im: 0 }, ends({}));
  return [
    straight,
    ...groundPaths(scene),
    ...scene.walls.map((wall) => wallPath(scene.rangeLengthM, wall)),
    ...scene.echoes.map((echo) => echoPath(scene.rangeLengthM, echo)),
  ];
}

function ends(given: Partial<Ends>): Ends {
  return {
    arrivalAzimuthDeg: 0,
    arrivalElevationDeg: 0,
    departureAzimuthDeg: 0,
    departureElevationDeg: 0,
    ...given,
  };
}

function pathBetween(lengthM: number, amplitude: Complex, at: Ends): Path {
  const look = (azimuthDeg: number, elevationDeg: number, v: Vector): Vector =>
    turn(azimuthTurn(azimuthDeg), turn(elevationTurn(elevationDeg), v));
  return {
    lengthM,
    amplitude,
    arrival: look(at.arrivalAzimuthDeg, at.arrivalElevationDeg, [1, 0, 0]),
    vertical: look(at.arrivalAzimuthDeg, at.arrivalElevationDeg, [0, 0, 1]),
    horizontal: look(at.arrivalAzimuthDeg, at.arrivalElevationDeg, [0, 1, 0]),
    departure: look(at.departureAzimuthDeg, at.departureElevationDeg, [1, 0, 0]),
  };
}

/** Flat ground: the image of the range antenna below it. The same coefficient for both polarizations. */
function groundPaths(scene: CompleteScene): Path[] {
  const { ground, rangeLengthM } = scene;
  if (!ground || ground.reflectionMagnitude === 0) return [];
  const rise = ground.rangeAntennaM - ground.autM;
  const sum = ground.rangeAntennaM + ground.autM;
  const along = Math.sqrt(rangeLengthM ** 2 - rise ** 2);
  const lengthM = Math.hypot(along, sum);
  const sightDeg = (Math.atan2(rise, along) * 180) / Math.PI;
  const bounceDeg = (Math.atan2(sum, along) * 180) / Math.PI;
  const magnitude = (ground.reflectionMagnitude * rangeLengthM) / lengthM;
  return [
    pathBetween(
      lengthM,
      fromPolar(magnitude, ground.reflectionPhaseDeg),
      ends({ arrivalElevationDeg: -bounceDeg - sightDeg, departureElevationDeg: -bounceDeg + sightDeg }),
    ),
  ];
}

/** A wall parallel to the line of sight: the image stands twice the distance to the side. */
function wallPath(rangeLengthM: number, wall: WallDescription): Path {
  const lengthM = Math.hypot(rangeLengthM, 2 * wall.distanceM);
  const asideDeg = (Math.atan2(2 * wall.distanceM, rangeLengthM) * 180) / Math.PI;
  // Left of the line as seen from the AUT is right of it as seen from the range antenna, which looks back.
  const arrivalAzimuthDeg = wall.side === 'left' ? asideDeg : -asideDeg;
  const magnitude = (10 ** (wall.reflectionDb / 20) * rangeLengthM) / lengthM;
  return pathBetween(
    lengthM,
    fromPolar(magnitude, wall.phaseDeg ?? 180),
    ends({ arrivalAzimuthDeg, departureAzimuthDeg: -arrivalAzimuthDeg }),
  );
}

function echoPath(rangeLengthM: number, echo: EchoDescription): Path {
  const { arrivalAzimuthDeg = 0, arrivalElevationDeg = 0 } = echo;
  const { departureAzimuthDeg = 0, departureElevationDeg = 0 } = echo;
  return pathBetween(
    rangeLengthM + echo.extraPathM,
    fromPolar(10 ** (echo.levelDb / 20), echo.phaseDeg ?? 0),
    { arrivalAzimuthDeg, arrivalElevationDeg, departureAzimuthDeg, departureElevationDeg },
  );
}
