// A position-report controller on the end of a memory wire, with the driver beside it, in virtual time.
import { MemoryPort } from '../../drivers/link/memory.ts';
import type { AxisSetup } from '../../drivers/positioner/positioner.ts';
import {
  ReportPositioner,
  type ReportPositionerOptions,
} from '../../drivers/positioner/report-positioner.ts';
import {
  PositionReportController,
  type ReportControllerOptions,
} from '../../mocks/positioner-report/report-controller.ts';
import { SimulatedClock } from '../../mocks/simulated-clock.ts';

export const turntable: AxisSetup = {
  name: 'azimuth',
  word: 'X',
  unitsPerDegree: 1,
  travelMinDeg: -190,
  travelMaxDeg: 190,
  rateDegPerS: 30,
  accelerationDegPerS2: 360,
  approachFrom: 'below',
  approachDeg: 2,
  settleMs: 0,
  toleranceDeg: 0.05,
  homing: 'none',
};

export interface ReportRig {
  clock: SimulatedClock;
  port: MemoryPort;
  controller: PositionReportController;
  positioner: ReportPositioner;
  /** Every line on the wire, `> ` sent, `< ` received. */
  traffic: string[];
  run: <T>(work: Promise<T>) => Promise<T>;
  shaftDeg: () => number;
}

/** `hears`: whether a line of the controller gets through to the driver. */
export function reportRig(
  controllerOptions: ReportControllerOptions = {},
  options: Partial<ReportPositionerOptions> = {},
  hears: (line: string) => boolean = () => true,
): ReportRig {
  const clock = new SimulatedClock();
  const controller = new PositionReportController(clock, controllerOptions);
  const port = new MemoryPort(clock, 'memory://turntable', {
    latencyMs: 1,
    cut: (bytes) => (hears(Buffer.from(bytes).toString('latin1').trim()) ? [bytes] : []),
  });
  port.listen((visitor) => controller.connect(visitor));
  const traffic: string[] = [];
  const positioner = new ReportPositioner(port.link(), clock, {
    axes: [turntable],
    onTraffic: (direction, text) => void traffic.push(`${direction === 'sent' ? '>' : '<'} ${text}`),
    ...options,
  });
  return {
    clock,
    port,
    controller,
    positioner,
    traffic,
    run: (work) => clock.run(work),
    shaftDeg: () => controller.shaftAt(clock.monotonicMs())[0]!,
  };
}

export async function readyReportRig(...args: Parameters<typeof reportRig>): Promise<ReportRig> {
  const rig = reportRig(...args);
  await rig.run(rig.positioner.identify());
  await rig.run(rig.positioner.home());
  return rig;
}
