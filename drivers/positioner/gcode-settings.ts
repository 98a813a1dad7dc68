// The controller's own settings that an unattended night depends on. Pure: takes the `$n=value` pairs read from
// the controller, says which of them is unsafe and how fast the axes may go. Nothing is ever written back.
import { DriverError } from '../errors.ts';
import type { ControllerLine } from './gcode-reports.ts';
import type { AxisName, AxisSetup } from './positioner.ts';
import { type AxisLimits, degreesOf } from './travel.ts';

export type Settings = ReadonlyMap<number, string>;

const idleDelay = 1;
const inches = 13;
const homingOn = 22;
const seekRate = 25;
const laserMode = 32;
const keepEnabledMask = 37;
const stepsPerUnit = 100;
const maxRate = 110;
const acceleration = 120;
const travel = 130;
const alwaysOn = 255;
/** Reports have three decimals. */
const reportRounding = 0.0005;

export function settingsIn(lines: readonly ControllerLine[]): Settings {
  return new Map(
    lines.flatMap((line) => (line.kind === 'setting' ? [[line.number, line.value] as const] : [])),
  );
}

/** Settings without which nothing can be judged and that did not arrive. */
export function missingSettings(settings: Settings, axes: readonly AxisSetup[], letters: string): number[] {
  const perAxis = axes.flatMap((axis) => {
    const index = letters.indexOf(axis.word);
    return [stepsPerUnit + index, maxRate + index, acceleration + index];
  });
  return [idleDelay, inches, ...perAxis].filter((number) => numberOf(settings, number) === undefined);
}

/** Throws POSITIONER_UNSAFE_SETTING with the number, its value and what it would have to be. */
export function checkSettings(settings: Settings, axes: readonly AxisSetup[], letters: string): void {
  checkMotorsStayOn(settings, axes, letters);
  // In inches every number of a report would be wrong by 25.4.
  demand(settings, inches, (value) => value === 0, 'reports in inches', '0');
  // In laser mode a motion without spindle power behaves differently from release to release.
  demand(settings, laserMode, (value) => value === 0, 'laser mode', '0');
  if (axes.some((axis) => axis.homing === 'switch')) {
    const isOn = (value: number): boolean => value % 2 === 1;
    demand(settings, homingOn, isOn, 'homing is off, but an axis is to be found by its switch', 'odd');
  }
  for (const axis of axes) checkAxis(settings, axis, letters.indexOf(axis.word));
}

function checkMotorsStayOn(settings: Settings, axes: readonly AxisSetup[], letters: string): void {
  const delayMs = numberOf(settings, idleDelay);
  if (delayMs === undefined || delayMs === alwaysOn) return;
  const mask = numberOf(settings, keepEnabledMask) ?? 0;
  const staysOn = (axis: AxisSetup): boolean => ((mask >> letters.indexOf(axis.word)) & 1) === 1;
  if (axes.every(staysOn)) return;
  throw unsafe(idleDelay, delayMs, 'motors are switched off between points: wind turns the axes', '255');
}

function checkAxis(settings: Settings, axis: AxisSetup, index: number): void {
  const isPositive = (value: number): boolean => value > 0;
  for (const base of [stepsPerUnit, maxRate, acceleration])
    demand(settings, base + index, isPositive, `${axis.name} cannot move`, 'above 0');
  const steps = numberOf(settings, stepsPerUnit + index);
  if (steps === undefined) return;
  const halfStepDeg = Math.abs(degreesOf(axis, 0.5 / steps + reportRounding));
  if (halfStepDeg <= axis.toleranceDeg) return;
  throw unsafe(
    stepsPerUnit + index,
    steps,
    `half a step of ${axis.name} is ${halfStepDeg.toFixed(4)}°, more than its tolerance of ${axis.toleranceDeg}°`,
    'finer steps or a wider tolerance',
  );
}

function demand(
  settings: Settings,
  number: number,
  isSafe: (value: number) => boolean,
  what: string,
  needed: string,
): void {
  const value = numberOf(settings, number);
  if (value !== undefined && !isSafe(value)) throw unsafe(number, value, what, needed);
}

function unsafe(number: number, value: number, what: string, needed: string): DriverError {
  return new DriverError('POSITIONER_UNSAFE_SETTING', `$${number}=${value}: ${what} (needed: ${needed})`, {
    setting: `$${number}`,
    value,
    needed,
  });
}

/** What governs each axis: the slower of the range's wish and the controller's setting. */
export function limitsFrom(
  settings: Settings,
  axes: readonly AxisSetup[],
  letters: string,
): Record<AxisName, AxisLimits> {
  return Object.fromEntries(
    axes.map((axis) => {
      const index = letters.indexOf(axis.word);
      const rate = numberOf(settings, maxRate + index) ?? Number.POSITIVE_INFINITY;
      const ramp = numberOf(settings, acceleration + index) ?? Number.POSITIVE_INFINITY;
      const limits: AxisLimits = {
        rateDegPerS: Math.min(axis.rateDegPerS, Math.abs(degreesOf(axis, rate / 60))),
        accelerationDegPerS2: Math.min(axis.accelerationDegPerS2, Math.abs(degreesOf(axis, ramp))),
      };
      return [axis.name, limits];
    }),
  );
}

/** A cycle that fails says so itself: only an answer that was lost is waited for in vain. */
const homingSecondsAtLeast = 150;

/**
 * Seconds after which a homing cycle must have ended: every axis in turn searches one and a half of its travel
 * at the seek rate and comes back slowly; half as much again for what the settings do not tell, and 10 s.
 */
export function homingSeconds(settings: Settings, axes: readonly AxisSetup[], letters: string): number {
  let seconds = 0;
  for (const axis of axes) {
    const index = letters.indexOf(axis.word);
    const rangeUnits = Math.abs((axis.travelMaxDeg - axis.travelMinDeg) * axis.unitsPerDegree);
    const searchUnits = 1.5 * Math.max(rangeUnits, numberOf(settings, travel + index) ?? 0);
    const axisRate = Math.abs(axis.rateDegPerS * axis.unitsPerDegree) * 60;
    const rate = Math.min(
      axisRate,
      numberOf(settings, seekRate) ?? axisRate,
      numberOf(settings, maxRate + index) ?? axisRate,
    );
    seconds += (searchUnits / Math.max(rate, 1e-3)) * 60;
  }
  return Math.max(seconds * 1.5 + 10, homingSecondsAtLeast);
}

/** undefined when the setting was not printed or is no number. */
function numberOf(settings: Settings, number: number): number | undefined {
  const text = settings.get(number);
  if (text === undefined || text === '') return undefined;
  const value = Number(text);
  return Number.isFinite(value) ? value : undefined;
}
