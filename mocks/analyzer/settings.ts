// What can be set on the instrument, within which limits, and what it makes of a wish it cannot fulfil.
import type { SParameterName } from './measurement.ts';
import type { Limits } from './parameter-values.ts';
import type { DataFormat } from './trace-format.ts';

export type SweepType = 'LIN' | 'LOG' | 'CW';
export type TraceFormat = 'MLOG' | 'MLIN' | 'PHAS' | 'SWR' | 'REAL' | 'IMAG' | 'POL' | 'SMIT';
export type TriggerSource = 'IMM' | 'INT' | 'BUS' | 'MAN' | 'EXT';

export interface Trace {
  parameter: SParameterName;
  format: TraceFormat;
  /** How commands speak of it, where they do so by name. */
  name: string;
  /** How commands speak of it, where they do so by a number that stays with it. */
  number: number;
  /** It stands in a window of the screen. */
  shown: boolean;
}

export interface Settings {
  startHz: number;
  stopHz: number;
  cwHz: number;
  points: number;
  sweepType: SweepType;
  ifBandwidthHz: number;
  dwellS: number;
  powerDbm: number;
  outputOn: boolean;
  averagingOn: boolean;
  averages: number;
  /** POIN: each point is averaged before the next; SWE: whole sweeps are. */
  averagingMode: 'POIN' | 'SWE';
  correctionOn: boolean;
  interpolationOn: boolean;
  continuous: boolean;
  triggerSource: TriggerSource;
  traces: readonly Trace[];
  /** Index of the trace that data are read from; −1: none is selected. */
  active: number;
  format: DataFormat;
  swapped: boolean;
}

export const limits = {
  frequencyHz: { min: 300e3, max: 9e9, def: 300e3 },
  points: { min: 1, max: 20_001, def: 201 },
  ifBandwidthHz: { min: 1, max: 1e6, def: 10e3 },
  powerDbm: { min: -60, max: 10, def: 0 },
  averages: { min: 1, max: 999, def: 1 },
  dwellS: { min: 0, max: 10, def: 0 },
  traces: { min: 1, max: 16, def: 1 },
} as const satisfies Record<string, Limits>;

const firstTrace: Trace = { parameter: 'S11', format: 'MLOG', name: 'FIRST', number: 1, shown: true };

/** As after reset; whether the calibration stays in force is the instrument's own way. */
export function presetSettings(correctionOn: boolean): Settings {
  return {
    startHz: limits.frequencyHz.min,
    stopHz: limits.frequencyHz.max,
    cwHz: limits.frequencyHz.min,
    points: limits.points.def,
    sweepType: 'LIN',
    ifBandwidthHz: limits.ifBandwidthHz.def,
    dwellS: 0,
    powerDbm: limits.powerDbm.def,
    outputOn: true,
    averagingOn: false,
    averages: limits.averages.def,
    averagingMode: 'SWE',
    correctionOn,
    interpolationOn: true,
    continuous: true,
    triggerSource: 'INT',
    traces: [firstTrace],
    active: 0,
    format: 'ascii',
    swapped: false,
  };
}

/** Steps within a decade at which filters exist. */
const bandwidthSteps = [1, 1.5, 2, 3, 5, 7, 10];

/** The next filter that is not narrower than the wish. */
export function existingBandwidthHz(wishHz: number): number {
  const decade = 10 ** Math.floor(Math.log10(wishHz) + 1e-12);
  const step = bandwidthSteps.find((one) => one * decade >= wishHz * (1 - 1e-12))!;
  return Math.round(step * decade * 10) / 10;
}

/** One end moved beyond the other takes the other along. */
export function withStart(startHz: number, stopHz: number): { startHz: number; stopHz: number } {
  return { startHz, stopHz: Math.max(startHz, stopHz) };
}

export function withStop(startHz: number, stopHz: number): { startHz: number; stopHz: number } {
  return { startHz: Math.min(startHz, stopHz), stopHz };
}

/** A span that would reach over an edge of the instrument shrinks until it fits. */
export function withCenterAndSpan(centerHz: number, spanHz: number): { startHz: number; stopHz: number } {
  const { min, max } = limits.frequencyHz;
  const half = Math.min(spanHz / 2, centerHz - min, max - centerHz);
  return { startHz: centerHz - half, stopHz: centerHz + half };
}

export function frequencyGrid(settings: Settings): Float64Array {
  const { startHz, stopHz, points, sweepType } = settings;
  const grid = new Float64Array(points);
  for (let i = 0; i < points; i++) {
    const share = points === 1 ? 0 : i / (points - 1);
    if (sweepType === 'CW') grid[i] = settings.cwHz;
    else if (sweepType === 'LOG') grid[i] = startHz * (stopHz / startHz) ** share;
    else grid[i] = startHz + (stopHz - startHz) * share;
  }
  if (sweepType !== 'CW' && points > 1) grid[points - 1] = stopHz;
  return grid;
}
