import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { expandPlan, type PlannedStep } from '../../../../daemon/plan/expand.ts';
import { remaining } from '../../../../daemon/plan/remaining.ts';
import { axis, cut, plan, range } from './planned.ts';

const { steps } = expandPlan(
  plan({
    cuts: [cut(), cut({ name: 'half', fromDeg: 0, toDeg: 20, stepDeg: 10 })],
    tieEverySamples: 2,
  }),
  range(axis()),
);
const short = (left: readonly PlannedStep[]) =>
  left.map((step) => `${step.purpose} ${step.cut} ${step.angleDeg}`);

describe('what remains of a run', () => {
  it('is all of it when nothing is stored, nothing when everything is', () => {
    expect(remaining(steps, [])).toStrictEqual(steps);
    expect(remaining(steps, steps)).toStrictEqual([]);
  });

  it('lies between ties of its own, from the tie before the break', () => {
    // Stored: tie, -180, -90, tie, 0; then the process died.
    expect(short(remaining(steps, steps.slice(0, 5)))).toStrictEqual([
      'tie azimuth 0',
      'cut azimuth 90',
      'tie azimuth 0',
      'closure azimuth 180',
      'tie azimuth 0',
      'tie half 0',
      'cut half 0',
      'cut half 10',
      'tie half 0',
      'cut half 20',
      'tie half 0',
    ]);
  });

  it('leaves out stretches that are done, wherever they are', () => {
    const stored = steps.filter((step) => step.angleDeg !== 20);
    expect(short(remaining(steps, stored))).toStrictEqual(['tie half 0', 'cut half 20', 'tie half 0']);
  });

  it('tells samples apart by cut and purpose, and forgives rounding of angles', () => {
    const stored = [
      { purpose: 'cut', cut: 'half', angleDeg: 10.0000000004 },
      { purpose: 'closure', cut: 'azimuth', angleDeg: -90 },
    ] as const;
    expect(remaining(steps, stored)).toHaveLength(steps.length - 1);
  });

  it('counts equal boresight samples one by one', () => {
    const reference = expandPlan(plan({ kind: 'reference', cuts: [] }), range(axis())).steps;
    expect(remaining(reference, reference.slice(0, 2))).toHaveLength(3);
  });

  it('takes no tie of a finished cut for boresight samples before it', () => {
    const cuts = [cut({ fromDeg: 0, toDeg: 10, stepDeg: 10 })];
    const all = expandPlan(plan({ kind: 'reference', cuts }), range(axis())).steps;
    expect(short(remaining(all, all.slice(1)))).toStrictEqual(['reference  0']);
  });

  it('and what is stored make up every sample once, and every sample left has ties around it', () => {
    fc.assert(
      fc.property(fc.array(fc.boolean(), { minLength: steps.length, maxLength: steps.length }), (kept) => {
        const stored = steps.filter((_, i) => kept[i]);
        const left = remaining(steps, stored);
        const samples = (list: readonly PlannedStep[]) =>
          short(list.filter((step) => step.purpose !== 'tie'));
        expect([...samples(stored), ...samples(left)].sort()).toStrictEqual(samples(steps).sort());
        if (left.length > 0) {
          expect(left[0]?.purpose).toBe('tie');
          expect(left.at(-1)?.purpose).toBe('tie');
        }
        expect(remaining(steps, [...stored, ...left])).toStrictEqual([]);
      }),
    );
  });
});
