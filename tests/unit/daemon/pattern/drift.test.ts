import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { type Drift, type DriftRefused, driftOf } from '../../../../daemon/pattern/drift.ts';
import { PatternError } from '../../../../daemon/pattern/pattern-error.ts';

const at = (levelDb: number, deg: number): [number, number] => {
  const size = 10 ** (levelDb / 20);
  return [size * Math.cos((deg * Math.PI) / 180), size * Math.sin((deg * Math.PI) / 180)];
};
const tie = (timeMs: number, ...values: [number, number][]) => ({
  timeMs,
  trace: Float64Array.from(values.flatMap(([db, deg]) => at(db, deg))),
});
function found(drift: Drift | DriftRefused): Drift {
  if (drift.kind === 'refused') throw new Error(drift.because);
  return drift;
}

describe('drift between ties', () => {
  it('turns a drifted sample of any moment back to the first tie', () => {
    fc.assert(
      fc.property(
        fc.double({ min: -3, max: 3, noNaN: true }),
        fc.double({ min: -59, max: 59, noNaN: true }),
        fc.double({ min: 0, max: 1, noNaN: true }),
        (driftDb, turnDeg, share) => {
          // A source that drifts straight in dB and degrees over 1000 ms, from −40 dB at 170°.
          const drift = found(driftOf([tie(5000, [-40, 170]), tie(6000, [-40 + driftDb, 170 + turnDeg])]));
          const [re, im] = at(-55 + share * driftDb, 30 + share * turnDeg);
          const factors = drift.factorsAt(5000 + 1000 * share);
          const corrected = [re * factors[0]! - im * factors[1]!, re * factors[1]! + im * factors[0]!];
          const [trueRe, trueIm] = at(-55, 30);
          expect(Math.hypot(corrected[0]! - trueRe, corrected[1]! - trueIm)).toBeLessThan(1e-12);
        },
      ),
    );
  });

  it('unwraps from tie to tie: three steps of 50° are 150°', () => {
    const drift = found(driftOf([tie(0, [0, 100]), tie(1, [0, 150]), tie(2, [0, -160]), tie(3, [0, -110])]));
    expect(drift.turnDeg[0]).toMatchObject({ kind: 'value' });
    expect(drift.turnDeg[0]!.kind === 'value' && drift.turnDeg[0]!.value).toBeCloseTo(150, 9);
    const factors = drift.factorsAt(3);
    expect((Math.atan2(factors[1]!, factors[0]!) * 180) / Math.PI).toBeCloseTo(-150, 9);
  });

  it('holds the outer ties and keeps frequencies apart', () => {
    const drift = found(driftOf([tie(10, [0, 0], [-20, 0]), tie(20, [1, 0], [-20, 0])]));
    const sizes = (timeMs: number) => {
      const factors = drift.factorsAt(timeMs);
      return [Math.hypot(factors[0]!, factors[1]!), Math.hypot(factors[2]!, factors[3]!)];
    };
    expect(sizes(0)).toEqual([1, 1]);
    expect(20 * Math.log10(sizes(99)[0]!)).toBeCloseTo(-1, 9);
    expect(20 * Math.log10(sizes(15)[0]!)).toBeCloseTo(-0.5, 9);
    expect(sizes(99)[1]).toBeCloseTo(1, 12);
    expect(drift.driftDb.map((figure) => figure.kind === 'value' && Number(figure.value.toFixed(9)))).toEqual(
      [1, 0],
    );
  });

  it('corrects nothing from one tie', () => {
    const drift = found(driftOf([tie(0, [-40, 33])]));
    expect([...drift.factorsAt(77)]).toEqual([1, 0]);
    expect(drift.driftDb[0]!.kind).toBe('absent');
  });

  it('refuses to guess more than 60° between ties, and says where', () => {
    const refused = driftOf([tie(0, [0, 0], [0, 0]), tie(1, [0, 59], [0, 10]), tie(2, [0, 100], [0, 75])]);
    expect(refused).toMatchObject({ kind: 'refused', frequencyIndices: [1], betweenMs: [1, 2] });
    expect(refused.kind === 'refused' && refused.worstTurnDeg).toBeCloseTo(65, 9);
    expect(driftOf([tie(0, [0, 0]), tie(1, [0, -61])]).kind).toBe('refused');
    expect(driftOf([tie(0, [0, 0]), tie(1, [0, -59.9])]).kind).toBe('value');
  });

  it('refuses a tie that is zero', () => {
    const refused = driftOf([tie(0, [0, 0]), { timeMs: 1, trace: Float64Array.of(0, 0) }]);
    expect(refused).toMatchObject({ kind: 'refused', because: 'a tie is zero', frequencyIndices: [0] });
  });

  it('refuses ties that do not belong together', () => {
    expect(() => driftOf([])).toThrow(PatternError);
    expect(() => driftOf([tie(1, [0, 0]), tie(1, [0, 0])])).toThrow(/not later/);
    expect(() => driftOf([tie(0, [0, 0]), tie(1, [0, 0], [0, 0])])).toThrow(/differ in length/);
    expect(() => driftOf([tie(0, [0, 0]), tie(1, [Number.NaN, 0])])).toThrow(PatternError);
    expect(() => found(driftOf([tie(0, [0, 0])])).factorsAt(Number.NaN)).toThrow(PatternError);
  });
});
