import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { DaemonError } from '../../../../daemon/errors.ts';
import { expandPlan, type PlannedRun } from '../../../../daemon/plan/expand.ts';
import { axis, cut, elevation, plan, range } from './planned.ts';

/** One line per step: purpose, pattern angle, target. */
function lines(planned: PlannedRun): string[] {
  return planned.steps.map(
    ({ purpose, angleDeg, target }) => `${purpose} ${angleDeg} @ ${Object.values(target).join(' ')}`,
  );
}

function refusal(act: () => unknown): DaemonError {
  let thrown: unknown;
  try {
    act();
  } catch (error) {
    thrown = error;
  }
  expect(thrown).toBeInstanceOf(DaemonError);
  return thrown as DaemonError;
}

describe('a cut', () => {
  it('of a full turn rises from its approach side, between ties, and closes', () => {
    const planned = expandPlan(plan({ tieEverySamples: 2 }), range(axis(), elevation()));
    expect(lines(planned)).toStrictEqual([
      'tie 0 @ 0 0',
      'cut -180 @ 0 -180',
      'cut -90 @ 0 -90',
      'tie 0 @ 0 0',
      'cut 0 @ 0 0',
      'cut 90 @ 0 90',
      'tie 0 @ 0 0',
      'closure 180 @ 0 180',
      'tie 0 @ 0 0',
    ]);
    expect(planned.steps[1]).toStrictEqual({
      purpose: 'cut',
      cut: 'azimuth',
      axis: 'azimuth',
      angleDeg: -180,
      target: { azimuth: -180, elevation: 0 },
      component: 'co',
    });
    expect(planned.sweeps).toStrictEqual([
      { cut: 'azimuth', axis: 'azimuth', samples: 5, firstDeg: -180, lastDeg: 180 },
    ]);
  });

  it('takes one tie where the last of N samples is the last of the cut', () => {
    const cuts = [cut({ fromDeg: 0, toDeg: 30, stepDeg: 10 })];
    expect(lines(expandPlan(plan({ cuts, tieEverySamples: 2 }), range(axis())))).toStrictEqual([
      'tie 0 @ 0',
      'cut 0 @ 0',
      'cut 10 @ 10',
      'tie 0 @ 0',
      'cut 20 @ 20',
      'cut 30 @ 30',
      'tie 0 @ 0',
    ]);
  });

  it('counts angles down where the sense is -1, to come from below all the same', () => {
    const turned = axis({ sense: -1, boresightDeg: 10 });
    const cuts = [cut({ fromDeg: -20, toDeg: 40, stepDeg: 20, component: 'cross' })];
    const planned = expandPlan(plan({ cuts }), range(turned));
    expect(lines(planned)).toStrictEqual([
      'tie 0 @ 10',
      'cut 40 @ -30',
      'cut 20 @ -10',
      'cut 0 @ 10',
      'cut -20 @ 30',
      'tie 0 @ 10',
    ]);
    expect(planned.steps.every((step) => step.component === 'cross')).toBe(true);
  });

  it('falls where the approach is from above', () => {
    const above = axis({ approachFrom: 'above', boresightDeg: -5 });
    expect(lines(expandPlan(plan(), range(above)))).toStrictEqual([
      'tie 0 @ -5',
      'cut 180 @ 175',
      'cut 90 @ 85',
      'cut 0 @ -5',
      'cut -90 @ -95',
      'closure -180 @ -185',
      'tie 0 @ -5',
    ]);
  });

  it('goes a turn further where the plan as written is out of travel', () => {
    const oneSided = axis({ travelMinDeg: -10, travelMaxDeg: 350 });
    const cuts = [cut({ fromDeg: -60, toDeg: -40, stepDeg: 10 })];
    expect(lines(expandPlan(plan({ cuts }), range(oneSided))).slice(1, 4)).toStrictEqual([
      'cut -60 @ 300',
      'cut -50 @ 310',
      'cut -40 @ 320',
    ]);
  });

  it('of a full turn begins at another direction where only that fits', () => {
    const oneSided = axis({ travelMinDeg: -95, travelMaxDeg: 275 });
    expect(lines(expandPlan(plan(), range(oneSided)))).toStrictEqual([
      'tie 0 @ 0',
      'cut -90 @ -90',
      'cut 0 @ 0',
      'cut 90 @ 90',
      'cut -180 @ 180',
      'closure -90 @ 270',
      'tie 0 @ 0',
    ]);
  });

  it('sets the other axes to their pattern angles', () => {
    const cuts = [cut({ fromDeg: 0, toDeg: 1, stepDeg: 1, at: { elevation: 30 } })];
    const planned = expandPlan(plan({ cuts }), range(axis(), elevation({ sense: -1, boresightDeg: 45 })));
    expect(planned.steps.map((step) => step.target)).toStrictEqual([
      { azimuth: 0, elevation: 45 },
      { elevation: 15, azimuth: 0 },
      { elevation: 15, azimuth: 1 },
      { azimuth: 0, elevation: 45 },
    ]);
  });

  it('follows the next, each with its own ties', () => {
    const cuts = [
      cut({ name: 'a', fromDeg: 0, toDeg: 1, stepDeg: 1 }),
      cut({ name: 'b', axis: 'elevation', fromDeg: 5, toDeg: 6, stepDeg: 1 }),
    ];
    const { steps } = expandPlan(plan({ cuts }), range(axis(), elevation()));
    expect(steps.map((step) => `${step.purpose} ${step.cut} ${step.axis} ${step.angleDeg}`)).toStrictEqual([
      'tie a azimuth 0',
      'cut a azimuth 0',
      'cut a azimuth 1',
      'tie a azimuth 0',
      'tie b elevation 0',
      'cut b elevation 5',
      'cut b elevation 6',
      'tie b elevation 0',
    ]);
  });
});

describe('a reference run', () => {
  it('is five samples at boresight, before cuts where it has some', () => {
    const planned = expandPlan(
      plan({ kind: 'reference', cuts: [] }),
      range(axis({ boresightDeg: 7 }), elevation()),
    );
    expect(lines(planned)).toStrictEqual(new Array(5).fill('reference 0 @ 7 0'));
    expect(planned.steps[0]).toMatchObject({ cut: '', axis: '', component: 'co' });
    const cuts = [cut({ fromDeg: 0, toDeg: 1, stepDeg: 1 })];
    const withCut = expandPlan(plan({ kind: 'reference', cuts }), range(axis()));
    expect(withCut.steps.map((step) => step.purpose).slice(4)).toStrictEqual([
      'reference',
      'tie',
      'cut',
      'cut',
      'tie',
    ]);
  });
});

describe('a plan that the range cannot do', () => {
  it('names the axis that is not there, swept or fixed', () => {
    const swept = refusal(() => expandPlan(plan({ cuts: [cut({ axis: 'azimut' })] }), range(axis())));
    expect(swept.code).toBe('PLAN_AXIS_UNKNOWN');
    expect(swept.message).toBe('cut azimuth: range meadow has no axis azimut; did you mean azimuth?');
    const fixed = refusal(() =>
      expandPlan(plan({ cuts: [cut({ at: { roll: 0 } })] }), range(axis(), elevation())),
    );
    expect(fixed.code).toBe('PLAN_AXIS_UNKNOWN');
    expect(fixed.message).toBe('cut azimuth: range meadow has no axis roll; its axes are azimuth, elevation');
  });

  it('names cut, axis, angle, travel and what helps', () => {
    const cuts = [cut({ name: 'tilt', axis: 'elevation', fromDeg: -30, toDeg: 60, stepDeg: 10 })];
    const error = refusal(() => expandPlan(plan({ cuts }), range(axis(), elevation())));
    expect(error.code).toBe('PLAN_OUTSIDE_TRAVEL');
    expect(error.message).toBe(
      'cut tilt: pattern angle -30 deg needs elevation at -30 deg, outside its travel of -10 to 90 deg; ' +
        'narrow the cut, widen the travel in the range file or move its boresight',
    );
    expect(error.facts).toStrictEqual({
      cut: 'tilt',
      axis: 'elevation',
      angleDeg: -30,
      positionDeg: -30,
      travelMinDeg: -10,
      travelMaxDeg: 90,
    });
  });

  it('names the far end of a cut', () => {
    const cuts = [cut({ axis: 'elevation', fromDeg: 0, toDeg: 100, stepDeg: 10 })];
    const error = refusal(() => expandPlan(plan({ cuts }), range(axis(), elevation())));
    expect(error.message).toContain('pattern angle 100 deg needs elevation at 100 deg, outside');
  });

  it('counts the approach as motion', () => {
    const tight = axis({ travelMinDeg: -180, travelMaxDeg: 181 });
    const error = refusal(() => expandPlan(plan(), range(tight)));
    expect(error.message).toBe(
      'cut azimuth: pattern angle -180 deg needs azimuth to begin its approach at -182 deg, ' +
        'outside its travel of -180 to 181 deg; leave 2 deg for the approach, by a narrower cut or wider travel',
    );
    const room = axis({ travelMinDeg: -182, travelMaxDeg: 180 });
    expect(expandPlan(plan(), range(room)).sweeps[0]?.firstDeg).toBe(-180);
  });

  it('names a fixed axis that cannot stand there, or not from its side', () => {
    const at = (deg: number) => plan({ cuts: [cut({ at: { elevation: deg } })] });
    const beyond = refusal(() => expandPlan(at(95), range(axis(), elevation())));
    expect(beyond.message).toContain(
      'pattern angle 95 deg needs elevation at 95 deg, outside its travel of -10 to 90',
    );
    const near = refusal(() => expandPlan(at(-9), range(axis(), elevation())));
    expect(near.message).toContain('needs elevation to begin its approach at -11 deg');
    expect(expandPlan(at(-8), range(axis(), elevation())).steps).toHaveLength(7);
  });
});

describe('any cut on any axis', () => {
  const anyAxis = fc
    .record({
      travelMinDeg: fc.integer({ min: -400, max: 0 }),
      travelMaxDeg: fc.integer({ min: 10, max: 700 }),
      approachFrom: fc.constantFrom('below' as const, 'above' as const),
      approachDeg: fc.integer({ min: 0, max: 5 }),
      sense: fc.constantFrom(1 as const, -1 as const),
      boresightDeg: fc.integer({ min: 5, max: 5 }),
    })
    .map((changes) => axis(changes));
  const anyCut = fc
    .record({
      fromDeg: fc.integer({ min: -360, max: 0 }),
      steps: fc.integer({ min: 1, max: 40 }),
      turn: fc.boolean(),
      span: fc.integer({ min: 1, max: 360 }),
    })
    .map(({ fromDeg, steps, turn, span }) => {
      const width = turn ? 360 : span;
      return { ...cut({ fromDeg, toDeg: fromDeg + width, stepDeg: width / steps }), steps };
    });

  it('stays in travel, steps evenly from the approach side, and covers every direction once', () => {
    fc.assert(
      fc.property(anyAxis, anyCut, (swept, { steps, ...planned }) => {
        const attempt = (() => {
          try {
            return expandPlan(plan({ cuts: [planned] }), range(swept));
          } catch (error) {
            expect(error).toBeInstanceOf(DaemonError);
            return undefined;
          }
        })();
        const side = swept.approachFrom === 'below' ? 1 : -1;
        const width = planned.toDeg - planned.fromDeg;
        if (attempt === undefined) {
          // Too wide for this travel in every turn; narrow cuts may also fall between two turns.
          const room = swept.travelMaxDeg - swept.travelMinDeg - swept.approachDeg;
          expect(room).toBeLessThan(width + 360);
          return;
        }
        const samples = attempt.steps.filter((step) => step.purpose !== 'tie');
        const at = samples.map((step) => step.target['azimuth']!);
        expect(samples).toHaveLength(steps + 1);
        for (const [i, deg] of at.entries()) {
          expect(deg - (side === 1 ? swept.approachDeg : 0)).toBeGreaterThanOrEqual(
            swept.travelMinDeg - 1e-9,
          );
          expect(deg + (side === -1 ? swept.approachDeg : 0)).toBeLessThanOrEqual(swept.travelMaxDeg + 1e-9);
          if (i > 0) expect(side * (deg - at[i - 1]!)).toBeCloseTo(width / steps, 6);
          const turns = (swept.sense * (deg - swept.boresightDeg) - samples[i]!.angleDeg) / 360;
          expect(turns).toBeCloseTo(Math.round(turns), 9);
        }
        const directions = new Set(samples.map((step) => step.angleDeg.toFixed(6)));
        const closes = width === 360;
        expect(samples.filter((step) => step.purpose === 'closure')).toHaveLength(closes ? 1 : 0);
        if (!closes) expect(directions.size).toBe(steps + 1);
      }),
      { numRuns: 500 },
    );
  });
});
