// What a position-report controller tells of its own settings, and which of them would spoil a night. Pure.
// What a build does not tell is not guessed: the range's own limits then govern. Nothing is stored in the
// controller; the modes that a night needs are set anew at every connection (see report-parts.ts).
import { DriverError } from '../errors.ts';
import type { AxisName, AxisSetup } from './positioner.ts';
import { type ByLetter, byLetter, type ReportLine } from './report-lines.ts';
import { type AxisLimits, degreesOf } from './travel.ts';

export interface ReportSettings {
  /** Steps per unit. */
  steps: ByLetter;
  /** Units per second, per axis. */
  rates: ByLetter;
  /** Units per second squared, per axis. */
  accelerations: ByLetter;
  /** One acceleration that no move exceeds. */
  travelAcceleration: number | undefined;
  /** Where targets are clipped without a word, once homed; undefined when off or not told. */
  clip: { min: ByLetter; max: ByLetter } | undefined;
}

/** Reports have two decimals. */
export const reportRounding = 0.005;

/** From the answers to `M503` and `M211`; later lines win. */
export function settingsFrom(lines: readonly ReportLine[]): ReportSettings {
  let found: ReportSettings = {
    steps: {},
    rates: {},
    accelerations: {},
    travelAcceleration: undefined,
    clip: undefined,
  };
  for (const line of lines) {
    if (line.kind !== 'remark') continue;
    found = { ...found, ...settingIn(line.text) };
  }
  return found;
}

function settingIn(text: string): Partial<ReportSettings> {
  const word = /^echo: *(M\d+) (.*)$/.exec(text);
  const values = byLetter(word?.[2] ?? '');
  if (word?.[1] === 'M92') return { steps: values };
  if (word?.[1] === 'M203') return { rates: values };
  if (word?.[1] === 'M201') return { accelerations: values };
  if (word?.[1] === 'M204') return { travelAcceleration: values['T'] ?? values['P'] };
  const clip = /^echo: ?Soft endstops: (ON|OFF) +Min: +(.*?) +Max: +(.*)$/.exec(text);
  if (!clip) return {};
  return {
    clip: clip[1] === 'ON' ? { min: byLetter(clip[2] ?? ''), max: byLetter(clip[3] ?? '') } : undefined,
  };
}

/** Throws POSITIONER_UNSAFE_SETTING with the command that shows the setting, its value and what is needed. */
export function checkReportSettings(settings: ReportSettings, axes: readonly AxisSetup[]): void {
  for (const axis of axes) {
    for (const [command, values] of [
      ['M92', settings.steps],
      ['M203', settings.rates],
      ['M201', settings.accelerations],
    ] as const) {
      const value = values[axis.word];
      if (value !== undefined && !(value > 0))
        throw unsafe(command, value, `${axis.name} cannot move`, 'above 0');
    }
    checkResolution(settings, axis);
    checkClip(settings, axis);
  }
}

function checkResolution({ steps }: ReportSettings, axis: AxisSetup): void {
  const perUnit = steps[axis.word];
  const halfStep = perUnit === undefined ? 0 : 0.5 / perUnit;
  const halfStepDeg = Math.abs(degreesOf(axis, halfStep + reportRounding));
  if (halfStepDeg <= axis.toleranceDeg) return;
  throw unsafe(
    'M92',
    perUnit ?? 'not told',
    `${axis.name} is reported no finer than ${halfStepDeg.toFixed(4)}°, its tolerance is ${axis.toleranceDeg}°`,
    'more units per degree, finer steps or a wider tolerance',
  );
}

/** Soft end stops clip a target silently, but only once the axis was homed. */
function checkClip({ clip }: ReportSettings, axis: AxisSetup): void {
  if (!clip || axis.homing !== 'switch') return;
  const ends = [axis.travelMinDeg, axis.travelMaxDeg].map((deg) => deg * axis.unitsPerDegree);
  const min = clip.min[axis.word] ?? Number.NEGATIVE_INFINITY;
  const max = clip.max[axis.word] ?? Number.POSITIVE_INFINITY;
  if (Math.min(...ends) >= min - reportRounding && Math.max(...ends) <= max + reportRounding) return;
  throw unsafe(
    'M211',
    `${min} to ${max}`,
    `soft end stops cut into the travel of ${axis.name} without a word`,
    'M211 S0, or limits outside its travel',
  );
}

function unsafe(setting: string, value: number | string, what: string, needed: string): DriverError {
  return new DriverError('POSITIONER_UNSAFE_SETTING', `${setting} ${value}: ${what} (needed: ${needed})`, {
    setting,
    value,
    needed,
  });
}

/** What governs each axis: the slower of the range's wish and the controller's setting, as far as told. */
export function reportLimits(
  settings: ReportSettings,
  axes: readonly AxisSetup[],
): Record<AxisName, AxisLimits> {
  return Object.fromEntries(
    axes.map((axis) => {
      const rate = settings.rates[axis.word] ?? Number.POSITIVE_INFINITY;
      const ramp = Math.min(
        settings.accelerations[axis.word] ?? Number.POSITIVE_INFINITY,
        settings.travelAcceleration ?? Number.POSITIVE_INFINITY,
      );
      const limits: AxisLimits = {
        rateDegPerS: Math.min(axis.rateDegPerS, Math.abs(degreesOf(axis, rate))),
        accelerationDegPerS2: Math.min(axis.accelerationDegPerS2, Math.abs(degreesOf(axis, ramp))),
      };
      return [axis.name, limits];
    }),
  );
}
