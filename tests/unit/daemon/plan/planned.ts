// Small ranges and plans, in values, for tests of the expansion.
import type { Plan, PlanCut } from '../../../../daemon/files/plan-file.ts';
import type { RangeAxis } from '../../../../daemon/files/range-file.ts';

export function axis(changes: Partial<RangeAxis> = {}): RangeAxis {
  return {
    name: 'azimuth',
    word: 'X',
    unitsPerDegree: 1,
    travelMinDeg: -200,
    travelMaxDeg: 200,
    rateDegPerS: 20,
    accelerationDegPerS2: 40,
    approachFrom: 'below',
    approachDeg: 2,
    settleMs: 200,
    toleranceDeg: 0.05,
    homing: 'none',
    sense: 1,
    boresightDeg: 0,
    ...changes,
  };
}

export function elevation(changes: Partial<RangeAxis> = {}): RangeAxis {
  return axis({ name: 'elevation', word: 'Y', travelMinDeg: -10, travelMaxDeg: 90, ...changes });
}

export function cut(changes: Partial<PlanCut> = {}): PlanCut {
  return {
    name: 'azimuth',
    axis: 'azimuth',
    plane: 'H',
    fromDeg: -180,
    toDeg: 180,
    stepDeg: 90,
    at: {},
    autRollDeg: 0,
    component: 'co',
    ...changes,
  };
}

export function plan(changes: Partial<Plan> = {}): Plan {
  return {
    path: '/site/a.plan.yaml',
    text: '',
    kind: 'pattern',
    antenna: { name: 'yagi', revision: 'A' },
    band: { startHz: 820e6, stopHz: 920e6, points: 201 },
    markersHz: [],
    analyzer: { ifBandwidthHz: 1000, powerDbm: -10, averages: 1 },
    gainReference: 'none',
    cuts: [cut()],
    tieEverySamples: 60,
    checks: { closureDb: 0.2, driftDb: 0.5 },
    ...changes,
  };
}

export function range(...axes: RangeAxis[]) {
  return { name: 'meadow', positioner: { axes } };
}
