// What the simulated position-report controller prints: boot messages, identity, settings, positions. Names and
// versions are our own inventions; the forms are those of the recordings.
import type { Settings } from '../positioner/settings.ts';

const letters = ['X', 'Y', 'Z'] as const;

export function bootLines(settings: Settings): string[] {
  return ['start', 'Benchturn 2.0.x', '', 'echo: Last Updated: 2026-01-10', ...settingLines(settings)];
}

export function settingLines(settings: Settings): string[] {
  const rates = settings.perAxis(110, 3).map((perMinute) => perMinute / 60);
  return [
    'echo:  G21    ; Units in mm (mm)',
    '',
    'echo:; Steps per unit:',
    `echo: M92 ${perLetter(settings.perAxis(100, 3))} E100.00`,
    'echo:; Maximum feedrates (units/s):',
    `echo:  M203 ${perLetter(rates)} E60.00`,
    'echo:; Maximum Acceleration (units/s2):',
    `echo:  M201 ${perLetter(settings.perAxis(120, 3))} E60.00`,
    'echo:; Acceleration (units/s2): P<print_accel> R<retract_accel> T<travel_accel>',
    'echo:  M204 P3000.00 R3000.00 T3000.00',
    'echo:; Home offset:',
    'echo:  M206 X0.00 Y0.00 Z0.00',
  ];
}

export function capabilityLines(watchesStream: boolean): string[] {
  return [
    'FIRMWARE_NAME:Benchturn 2.0.x (Jan 10 2026 12:00:00) SOURCE_CODE_URL:example.org/benchturn PROTOCOL_VERSION:1.0 MACHINE_TYPE:Turntable EXTRUDER_COUNT:0 UUID:00000000-0000-0000-0000-000000000000',
    'Cap:SERIAL_XON_XOFF:0',
    'Cap:EEPROM:0',
    `Cap:EMERGENCY_PARSER:${watchesStream ? 1 : 0}`,
    'Cap:ARCS:1',
  ];
}

export function softEndLine(isOn: boolean): string {
  return `echo:Soft endstops: ${isOn ? 'ON' : 'OFF'}  Min:  X0.00 Y0.00 Z0.00   Max:  X200.00 Y200.00 Z200.00`;
}

/** Two decimals for the logical place, whole steps for the counter. */
export function positionLine(
  place: readonly number[],
  offset: readonly number[],
  stepsPerUnit: readonly number[],
): string {
  const logical = letters.map((letter, axis) => `${letter}:${(place[axis]! + offset[axis]!).toFixed(2)}`);
  const counts = letters.map((letter, axis) => `${letter}:${Math.round(place[axis]! * stepsPerUnit[axis]!)}`);
  return `${logical.join(' ')} E:0.00 Count ${counts.join(' ')}`;
}

function perLetter(values: readonly number[]): string {
  return letters.map((letter, axis) => `${letter}${values[axis]!.toFixed(2)}`).join(' ');
}
