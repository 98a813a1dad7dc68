import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { Closure } from '../../../../daemon/pattern/closure.ts';
import { checkCut, cutFromSamples } from '../../../../daemon/pattern/cut.ts';
import { PatternError } from '../../../../daemon/pattern/pattern-error.ts';
import { byHand } from './cut-samples.ts';

const range = (from: number, to: number, step: number): number[] =>
  Array.from({ length: Math.round((to - from) / step) + 1 }, (_, k) => from + k * step);

const closureNumbers = (found: Closure | undefined): unknown[] =>
  [found?.levelDb, found?.phaseDeg].map((figure) => (figure?.kind === 'value' ? figure.value : figure?.kind));

describe('a cut from samples', () => {
  it('merges the duplicate end of a full turn and reports its closure', () => {
    const anglesDeg = range(-180, 180, 90);
    const { cut, closure } = cutFromSamples({ anglesDeg, levelDb: [-20, -10, 0, -10, -20.5] });
    expect([...cut.anglesDeg]).toEqual([-90, 0, 90, 180]);
    expect([...cut.levelDb]).toEqual([-10, 0, -10, -20.25]);
    expect(cut.periodic).toBe(true);
    expect(closureNumbers(closure)).toEqual([-0.5, 'absent']);
  });

  it('merges complex values, not their levels', () => {
    const { cut, closure } = cutFromSamples({
      anglesDeg: range(0, 360, 120),
      trace: [1, 0, 0.5, 0, 0.5, 0, 0, 1],
    });
    // The mean of 1 and j is (1 + j)/2: 3.01 dB down; the closure is a quarter turn of phase.
    expect([...cut.anglesDeg]).toEqual([-120, 0, 120]);
    expect([...cut.trace!.slice(2, 4)]).toEqual([0.5, 0.5]);
    expect(cut.levelDb[1]).toBeCloseTo(-3.0103, 4);
    const [levelDb, phaseDeg] = closureNumbers(closure);
    expect(levelDb).toBeCloseTo(0, 12);
    expect(phaseDeg).toBeCloseTo(90, 12);
  });

  it('takes a travel towards smaller angles, with its closure in the order of time', () => {
    const { cut, closure } = cutFromSamples({
      anglesDeg: range(-180, 180, 90).reverse(),
      levelDb: [-21, -10, 0, -9, -20],
    });
    expect([...cut.anglesDeg]).toEqual([-90, 0, 90, 180]);
    expect([...cut.levelDb]).toEqual([-9, 0, -10, -20.5]);
    expect(closureNumbers(closure)).toEqual([1, 'absent']);
  });

  it('finds a full turn without its duplicate end, and wraps it', () => {
    const { cut, closure } = cutFromSamples({
      anglesDeg: range(0, 359, 1),
      levelDb: range(0, 359, 1).map((d) => -d / 10),
    });
    expect(cut.periodic).toBe(true);
    expect(closure).toBeUndefined();
    expect(cut.anglesDeg[0]).toBe(-179);
    expect(cut.anglesDeg.at(-1)).toBe(180);
    expect(cut.levelDb[cut.anglesDeg.indexOf(-90)]).toBe(-27);
  });

  it('merges an end that read-back puts a little beside 360°', () => {
    const anglesDeg = range(-180, 180, 5);
    anglesDeg[anglesDeg.length - 1] = 180.03;
    const { cut, closure } = cutFromSamples({ anglesDeg, levelDb: anglesDeg.map(() => -3) });
    expect(cut.periodic).toBe(true);
    expect(cut.anglesDeg).toHaveLength(72);
    expect(closure).toBeDefined();
  });

  it('keeps a part of a turn as travelled, across 180° as well', () => {
    const { cut } = cutFromSamples({ anglesDeg: [170, 175, 180, -175, -170], levelDb: [0, 1, 2, 1, 0] });
    expect([...cut.anglesDeg]).toEqual([170, 175, 180, 185, 190]);
    expect(cut.periodic).toBe(false);
  });

  it.each([
    ['out of order', { anglesDeg: [0, 2, 1, 3], levelDb: [0, 0, 0, 0] }, /out of order/],
    ['twice', { anglesDeg: [0, 1, 1, 2], levelDb: [0, 0, 0, 0] }, /there twice/],
    ['no number', { anglesDeg: [0, Number.NaN, 2], levelDb: [0, 0, 0] }, /NaN/],
    ['no level', { anglesDeg: [0, 1, 2], levelDb: [0, Number.NEGATIVE_INFINITY, 0] }, /-Infinity dB/],
    ['too few', { anglesDeg: [0, 1], levelDb: [0, 0] }, /three or more/],
    ['other lengths', { anglesDeg: [0, 1, 2], levelDb: [0, 0] }, /each with one level/],
    ['nothing measured', { anglesDeg: [0, 1, 2] }, /each with one level/],
    ['more than a turn', { anglesDeg: range(0, 370, 10), levelDb: range(0, 370, 10) }, /more than one turn/],
  ])('refuses angles or levels that are %s', (_, samples, message) => {
    expect(() => cutFromSamples(samples)).toThrow(PatternError);
    expect(() => cutFromSamples(samples)).toThrow(message);
  });

  it('loses no level: any full turn keeps its samples whatever angle it starts at', () => {
    fc.assert(
      fc.property(
        fc.integer({ min: 3, max: 60 }),
        fc.integer({ min: -400, max: 400 }),
        fc.boolean(),
        (count, startDeg, back) => {
          const stepDeg = (back ? -360 : 360) / count;
          const anglesDeg = Array.from({ length: count + 1 }, (_, k) => startDeg + k * stepDeg);
          const levelDb = anglesDeg.map((_, k) => 0 - (k % count));
          const { cut, closure } = cutFromSamples({ anglesDeg, levelDb });
          expect(cut.periodic).toBe(true);
          expect([...cut.levelDb].sort((a, b) => b - a)).toEqual(
            Array.from({ length: count }, (_, k) => 0 - k),
          );
          expect(closureNumbers(closure)[0]).toBe(0);
          for (const angleDeg of cut.anglesDeg) expect(angleDeg > -180 && angleDeg <= 180).toBe(true);
        },
      ),
    );
  });
});

describe('checking a cut', () => {
  it('refuses a full turn with its end twice', () => {
    expect(() => checkCut(byHand([-180, 0, 180], [0, 0, 0], true))).toThrow(/keeps its end once/);
    expect(checkCut(byHand([-180, 0, 180], [0, 0, 0], false)).periodic).toBe(false);
  });

  it('names the value and carries the facts', () => {
    try {
      checkCut(byHand([0, 1, 2], [0, 2000, 0]));
      expect.unreachable();
    } catch (error) {
      expect(error).toBeInstanceOf(PatternError);
      expect((error as PatternError).code).toBe('PATTERN_BAD_INPUT');
      expect((error as PatternError).facts).toEqual({ index: 1, levelDb: '2000' });
    }
  });

  it('refuses a trace of another length', () => {
    expect(() => checkCut({ ...byHand([0, 1, 2], [0, 0, 0]), trace: new Float64Array(4) })).toThrow(
      PatternError,
    );
  });
});
