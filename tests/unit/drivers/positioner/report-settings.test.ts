// Settings as a real controller of the family printed them, and what a night makes of them.
import { describe, expect, it } from 'vitest';
import { DriverError } from '../../../../drivers/errors.ts';
import { readReportLine } from '../../../../drivers/positioner/report-lines.ts';
import {
  checkReportSettings,
  reportLimits,
  settingsFrom,
} from '../../../../drivers/positioner/report-settings.ts';
import { turntable } from '../../../support/report-rig.ts';

const recorded = [
  'echo:  G21    ; Units in mm (mm)',
  '',
  'echo:; Steps per unit:',
  'echo: M92 X100.00 Y100.00 Z100.00 E100.00',
  'echo:; Maximum feedrates (units/s):',
  'echo:  M203 X60.00 Y50.00 Z60.00 E60.00',
  'echo:; Maximum Acceleration (units/s2):',
  'echo:  M201 X60.00 Y70.00 Z60.00 E60.00',
  'echo:; Acceleration (units/s2): P<print_accel> R<retract_accel> T<travel_accel>',
  'echo:  M204 P3000.00 R3000.00 T40.00',
];
const softEnds = (state: string): string =>
  `echo:Soft endstops: ${state}  Min:  X0.00 Y0.00 Z0.00   Max:  X200.00 Y200.00 Z200.00`;
const read = (...texts: string[]) => settingsFrom(texts.map(readReportLine));

function refusal(act: () => void): DriverError {
  try {
    act();
  } catch (error) {
    if (error instanceof DriverError) return error;
    throw error;
  }
  throw new Error('it was let pass');
}

describe('settings of a position-report controller', () => {
  it('are read as far as they are told', () => {
    expect(read(...recorded, softEnds('OFF'))).toEqual({
      steps: { X: 100, Y: 100, Z: 100, E: 100 },
      rates: { X: 60, Y: 50, Z: 60, E: 60 },
      accelerations: { X: 60, Y: 70, Z: 60, E: 60 },
      travelAcceleration: 40,
      clip: undefined,
    });
    expect(read('ok').steps).toEqual({});
  });

  it('limit the axes: rates are per second, the lower acceleration counts, degrees are units per degree', () => {
    const axis = { ...turntable, rateDegPerS: 90, accelerationDegPerS2: 360, unitsPerDegree: -2 };
    expect(reportLimits(read(...recorded), [axis])).toEqual({
      azimuth: { rateDegPerS: 30, accelerationDegPerS2: 20 },
    });
    expect(reportLimits(read(), [axis])).toEqual({
      azimuth: { rateDegPerS: 90, accelerationDegPerS2: 360 },
    });
  });

  it('let pass what harms nobody', () => {
    const homed = { ...turntable, homing: 'switch', travelMinDeg: 0, travelMaxDeg: 200 } as const;
    checkReportSettings(read(...recorded, softEnds('ON')), [homed]);
    // Before homing soft ends do nothing, and an axis without a switch is never homed.
    checkReportSettings(read(...recorded, softEnds('ON')), [turntable]);
    checkReportSettings(read(...recorded, softEnds('OFF')), [{ ...turntable, homing: 'switch' }]);
  });

  it.each([
    ['M211', { homing: 'switch' as const, travelMaxDeg: 200, travelMinDeg: -1 }, [softEnds('ON')]],
    ['M211', { homing: 'switch' as const, travelMaxDeg: 200.1, travelMinDeg: 0 }, [softEnds('ON')]],
    // Half a step of 0.05° and half the last decimal are 0.055°.
    ['M92', { toleranceDeg: 0.05 }, ['echo: M92 X10.00']],
    ['M92', { toleranceDeg: 0.004 }, []],
    ['M203', {}, ['echo:  M203 X0.00']],
    ['M201', {}, ['echo:  M201 X0.00']],
  ])('refuse %s that would spoil a night', (setting, axis, texts) => {
    const error = refusal(() => checkReportSettings(read(...texts), [{ ...turntable, ...axis }]));
    expect(error.code).toBe('POSITIONER_UNSAFE_SETTING');
    expect(error.facts['setting']).toBe(setting);
  });
});
