// Degrees to controller units and back, the side from which a stop is approached, travel, and how long a
// motion takes. Pure. Every motion line is made here, and none is made for a place outside travel.
// Coordinates lie on an endless line: 190° and −170° are two places, and the cable knows the difference.
import { DriverError } from '../errors.ts';
import type { AxisName, AxisSetup, Position } from './positioner.ts';

/** Fixed notation; the firmware keeps the first 8 digits of a number and knows no exponents. */
const maxDigits = 8;
const maxDecimals = 4;
const sameDeg = 1e-9;

export function unitsOf(axis: AxisSetup, positionDeg: number): number {
  return positionDeg * axis.unitsPerDegree;
}

export function degreesOf(axis: AxisSetup, units: number): number {
  return units / axis.unitsPerDegree + 0;
}

/**
 * The targets an axis can be sent to: its travel less the approach stretch on the side it comes from. A target
 * nearer to that end could only be reached from the wrong side, or by leaving travel: it is refused, not bent.
 */
export function reachableDeg(axis: AxisSetup): { minDeg: number; maxDeg: number } {
  return axis.approachFrom === 'below'
    ? { minDeg: axis.travelMinDeg + axis.approachDeg, maxDeg: axis.travelMaxDeg }
    : { minDeg: axis.travelMinDeg, maxDeg: axis.travelMaxDeg - axis.approachDeg };
}

/** The named axes of a target with their coordinates. Throws POSITIONER_OUTSIDE_TRAVEL, also for a name not known. */
export function checkTarget(axes: readonly AxisSetup[], target: Position): void {
  for (const [name, targetDeg] of Object.entries(target)) {
    const axis = axes.find((candidate) => candidate.name === name);
    if (!axis) {
      throw new DriverError('POSITIONER_OUTSIDE_TRAVEL', `there is no axis ${name}`, { axis: name });
    }
    const { minDeg, maxDeg } = reachableDeg(axis);
    if (!(targetDeg >= minDeg && targetDeg <= maxDeg)) {
      throw new DriverError(
        'POSITIONER_OUTSIDE_TRAVEL',
        `${name} cannot go to ${targetDeg}°: ${minDeg}° to ${maxDeg}° can be reached`,
        { axis: name, targetDeg, minDeg, maxDeg, approachDeg: axis.approachDeg },
      );
    }
  }
}

/** Where an axis stands; `takenUp`: it came to rest from its approach side and has not moved since. */
export interface Stand {
  deg: number;
  takenUp: boolean;
}

/** Where each axis stands: where we sent it, as long as it is still there; otherwise where it says to be. */
export function standsOf(
  axes: readonly AxisSetup[],
  sentDeg: Position,
  reportedDeg: Position,
): Record<AxisName, Stand> {
  return Object.fromEntries(
    axes.map((axis) => {
      const reported = reportedDeg[axis.name] ?? Number.NaN;
      const sent = sentDeg[axis.name];
      const takenUp = sent !== undefined && Math.abs(sent - reported) <= axis.toleranceDeg;
      return [axis.name, { deg: takenUp ? sent : reported, takenUp }];
    }),
  );
}

/** The longest wait of the axes that a target names. */
export function settleMsOf(axes: readonly AxisSetup[], target: Position): number {
  const named = axes.filter((axis) => target[axis.name] !== undefined);
  return Math.max(0, ...named.map((axis) => axis.settleMs));
}

/**
 * The straight moves that lead to a target, each within travel. One is enough where an axis comes a full
 * approach stretch from its side, or stands with its play already taken up on that side; otherwise
 *
 *      target −approach          target            approach from below
 *          │◄────────── 1 ─────────┼──────── stand
 *          └────────── 2 ─────────►│
 *
 * An axis that is at the target already is left out, unless `throughApproach` asks to leave and come back.
 */
export function planLegs(
  axes: readonly AxisSetup[],
  stands: Readonly<Record<AxisName, Stand>>,
  target: Position,
  throughApproach = false,
): Position[] {
  checkTarget(axes, target);
  const away: Record<AxisName, number> = {};
  const last: Record<AxisName, number> = {};
  for (const axis of axes) {
    const targetDeg = target[axis.name];
    const stand = stands[axis.name];
    if (targetDeg === undefined || !stand) continue;
    const startDeg = approachStart(axis, stand, targetDeg, throughApproach);
    if (startDeg === 'there') continue;
    if (startDeg !== undefined) away[axis.name] = startDeg;
    last[axis.name] = targetDeg;
  }
  if (Object.keys(away).length === 0) return Object.keys(last).length === 0 ? [] : [last];
  // Axes that need no detour go straight to their target while the others step back.
  const first = { ...last, ...away };
  const second = Object.fromEntries(Object.keys(away).map((name) => [name, last[name] ?? 0]));
  return [first, second];
}

function approachStart(
  axis: AxisSetup,
  stand: Stand,
  targetDeg: number,
  throughApproach: boolean,
): number | 'there' | undefined {
  const side = axis.approachFrom === 'below' ? 1 : -1;
  const aheadDeg = side * (targetDeg - stand.deg);
  const isThere = stand.takenUp && Math.abs(aheadDeg) <= sameDeg;
  if (axis.approachDeg === 0) return isThere ? 'there' : undefined;
  if (aheadDeg >= axis.approachDeg) return undefined;
  if (!throughApproach && isThere) return 'there';
  if (!throughApproach && stand.takenUp && aheadDeg > 0) return undefined;
  return targetDeg - side * axis.approachDeg;
}

/**
 * Seconds for a straight motion over `distanceDeg` with constant acceleration up to the rate and down again.
 *
 *   rate ┤   ┌──────────┐            /\
 *        │  /            \          /  \      too short to reach the rate: t = 2·√(d/a)
 *        └─/──────────────\──►    ─/────\──►
 */
export function motionSeconds(
  distanceDeg: number,
  rateDegPerS: number,
  accelerationDegPerS2: number,
): number {
  const distance = Math.abs(distanceDeg);
  const rampsDeg = rateDegPerS ** 2 / accelerationDegPerS2;
  if (distance < rampsDeg) return 2 * Math.sqrt(distance / accelerationDegPerS2);
  return distance / rateDegPerS + rateDegPerS / accelerationDegPerS2;
}

/** Limits in force for an axis: the slower of what the range asks for and what the controller is set to. */
export interface AxisLimits {
  rateDegPerS: number;
  accelerationDegPerS2: number;
}

export interface LegMotion {
  /** Along the straight line through all axes in controller units: what the feed word means with several axes. */
  feedUnitsPerMin: number;
  seconds: number;
}

/**
 * Feed and duration of a straight move over the axes of `toDeg`, such that no axis exceeds its own limits.
 * With s from 0 to 1 along the line, axis i turns d_i·s: the tightest of rate_i/|d_i| and a_i/|d_i| governs.
 */
export function legMotion(
  axes: readonly AxisSetup[],
  limits: Readonly<Record<AxisName, AxisLimits>>,
  fromDeg: Position,
  toDeg: Position,
): LegMotion {
  let pathUnits = 0;
  let perSecond = Number.POSITIVE_INFINITY;
  let perSecond2 = Number.POSITIVE_INFINITY;
  for (const axis of axes) {
    const distanceDeg = Math.abs((toDeg[axis.name] ?? Number.NaN) - (fromDeg[axis.name] ?? Number.NaN));
    const limit = limits[axis.name] ?? axis;
    // A difference that rounding alone makes has no duration that could be computed.
    if (!(distanceDeg > sameDeg)) continue;
    pathUnits = Math.hypot(pathUnits, unitsOf(axis, distanceDeg));
    perSecond = Math.min(perSecond, limit.rateDegPerS / distanceDeg);
    perSecond2 = Math.min(perSecond2, limit.accelerationDegPerS2 / distanceDeg);
  }
  if (pathUnits === 0) return { feedUnitsPerMin: slowestFeed(axes, limits, toDeg), seconds: 0 };
  return { feedUnitsPerMin: pathUnits * perSecond * 60, seconds: motionSeconds(1, perSecond, perSecond2) };
}

/** For a move of no length the firmware still wants a feed. */
function slowestFeed(
  axes: readonly AxisSetup[],
  limits: Readonly<Record<AxisName, AxisLimits>>,
  toDeg: Position,
): number {
  const named = axes.filter((axis) => toDeg[axis.name] !== undefined);
  const feeds = named.map((axis) => unitsOf(axis, (limits[axis.name] ?? axis).rateDegPerS) * 60);
  return Math.min(...feeds.map(Math.abs));
}

/**
 * The motion line for one straight move: absolute, in machine coordinates (offsets left by another job do not
 * count), with every mode it relies on, so that a reset in between cannot change its sense.
 * Throws POSITIONER_OUTSIDE_TRAVEL rather than make a line that leads outside.
 */
export function motionLine(axes: readonly AxisSetup[], toDeg: Position, feedUnitsPerMin: number): string {
  return `G21 G90 G94 G53 ${plainMotionLine(axes, toDeg, feedUnitsPerMin)}`;
}

/**
 * The same for controllers that take one command to a line: the modes go ahead of it, each on its own.
 * Throws POSITIONER_OUTSIDE_TRAVEL.
 */
export function plainMotionLine(
  axes: readonly AxisSetup[],
  toDeg: Position,
  feedUnitsPerMin: number,
): string {
  const words = axes.flatMap((axis) => {
    const targetDeg = toDeg[axis.name];
    return targetDeg === undefined ? [] : [`${axis.word}${fixedNotation(unitsInside(axis, targetDeg))}`];
  });
  return `G1 ${words.join(' ')} F${fixedNotation(Math.max(feedUnitsPerMin, 0.01))}`;
}

/** The target on the grid of what can be written, rounded inwards where rounding would step over a limit. */
function unitsInside(axis: AxisSetup, targetDeg: number): number {
  const { travelMinDeg, travelMaxDeg } = axis;
  if (!(targetDeg >= travelMinDeg && targetDeg <= travelMaxDeg)) {
    throw new DriverError('POSITIONER_OUTSIDE_TRAVEL', `${axis.name} would leave its travel`, {
      axis: axis.name,
      targetDeg,
      travelMinDeg,
      travelMaxDeg,
    });
  }
  const units = unitsOf(axis, targetDeg);
  const grid = 10 ** -decimalsOf(units);
  const nearest = Math.round(units / grid);
  const inside = [nearest, nearest - 1, nearest + 1].find((count) => {
    const deg = degreesOf(axis, count * grid);
    return deg >= travelMinDeg && deg <= travelMaxDeg;
  });
  if (inside === undefined) {
    throw new DriverError('POSITIONER_OUTSIDE_TRAVEL', `${axis.name} has a travel narrower than a number`, {
      axis: axis.name,
    });
  }
  return inside * grid;
}

function decimalsOf(units: number): number {
  const wholeDigits = Math.trunc(Math.abs(units)).toString().length;
  return Math.max(0, Math.min(maxDecimals, maxDigits - wholeDigits));
}

function fixedNotation(value: number): string {
  const text = value.toFixed(decimalsOf(value));
  const short = text.includes('.') ? text.replace(/\.?0+$/, '') : text;
  return short === '-0' ? '0' : short;
}
