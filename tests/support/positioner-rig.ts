// A positioner over a scripted controller in simulated time, for the positioner's unit tests.
import { DriverError, type DriverErrorCode } from '../../drivers/errors.ts';
import { MemoryPort, type MemoryPortOptions } from '../../drivers/link/memory.ts';
import { GcodePositioner, type GcodePositionerOptions } from '../../drivers/positioner/gcode-positioner.ts';
import type { AxisSetup } from '../../drivers/positioner/positioner.ts';
import { SimulatedClock } from '../../mocks/simulated-clock.ts';
import { ScriptedController, type ScriptedOptions } from './scripted-controller.ts';

export const azimuth: AxisSetup = {
  name: 'azimuth',
  word: 'X',
  unitsPerDegree: 1,
  travelMinDeg: -190,
  travelMaxDeg: 190,
  rateDegPerS: 20,
  accelerationDegPerS2: 200,
  approachFrom: 'below',
  approachDeg: 2,
  settleMs: 300,
  toleranceDeg: 0.02,
  homing: 'none',
};

export const elevation: AxisSetup = {
  ...azimuth,
  name: 'elevation',
  word: 'Y',
  travelMinDeg: -20,
  travelMaxDeg: 90,
  approachFrom: 'above',
};

export interface Rig {
  clock: SimulatedClock;
  controller: ScriptedController;
  positioner: GcodePositioner;
}

export function makeRig(
  scripted: ScriptedOptions = {},
  options: Partial<GcodePositionerOptions> = {},
  port: MemoryPortOptions = { latencyMs: 2 },
): Rig {
  const clock = new SimulatedClock();
  const controller = new ScriptedController(clock, scripted);
  const wire = new MemoryPort(clock, 'memory://stage', port);
  wire.listen(controller.accept);
  const positioner = new GcodePositioner(wire.link(), clock, { axes: [azimuth, elevation], ...options });
  return { clock, controller, positioner };
}

/** Identified and homed. */
export async function makeReadyRig(...args: Parameters<typeof makeRig>): Promise<Rig> {
  const rig = makeRig(...args);
  await rig.clock.run(rig.positioner.identify().then(() => rig.positioner.home()));
  return rig;
}

/** The code of the failure; a message in its place when there was none or it is of another kind. */
export async function codeOf(
  clock: SimulatedClock,
  work: Promise<unknown>,
): Promise<DriverErrorCode | string> {
  return (await failureOf(clock, work))?.code ?? 'no failure';
}

export async function failureOf(
  clock: SimulatedClock,
  work: Promise<unknown>,
): Promise<DriverError | undefined> {
  try {
    await clock.run(work);
    return undefined;
  } catch (error) {
    if (error instanceof DriverError) return error;
    throw error;
  }
}

/** Targets of every motion line a controller was sent, read by rules of this file alone: letter, sign, digits. */
export function motionTargets(lines: readonly string[]): Record<string, number>[] {
  return lines
    .filter((line) => /G(?:0|1|2|3|28|30)(?![\d.])|\$J|\$H/.test(line.replaceAll(' ', '')) && line !== '$H')
    .map((line) => {
      const target: Record<string, number> = {};
      for (const [, letter, number] of line.matchAll(/([A-Z]) *([-+]?\d*\.?\d+)/g)) {
        if (letter && 'XYZABCUVW'.includes(letter)) target[letter] = Number.parseFloat(number ?? '');
      }
      return target;
    });
}
