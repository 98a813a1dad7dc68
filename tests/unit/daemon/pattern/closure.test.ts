import { describe, expect, it } from 'vitest';
import { closure, levelClosure } from '../../../../daemon/pattern/closure.ts';
import { PatternError } from '../../../../daemon/pattern/pattern-error.ts';

describe('closure', () => {
  it('is level and phase of last over first, at each frequency', () => {
    // First 1 and 2 at −170°; last 0.5 at 90° and 2 at 170°: −6.02 dB and 90°; 0 dB and −20°.
    const at = (size: number, deg: number) => [
      size * Math.cos((deg * Math.PI) / 180),
      size * Math.sin((deg * Math.PI) / 180),
    ];
    const [one, two] = closure(
      Float64Array.from([...at(1, 0), ...at(2, -170)]),
      Float64Array.from([...at(0.5, 90), ...at(2, 170)]),
    );
    expect(one!.levelDb.kind === 'value' && one!.levelDb.value).toBeCloseTo(-6.0206, 4);
    expect(one!.phaseDeg.kind === 'value' && one!.phaseDeg.value).toBeCloseTo(90, 9);
    expect(two!.levelDb.kind === 'value' && two!.levelDb.value).toBeCloseTo(0, 9);
    expect(two!.phaseDeg.kind === 'value' && two!.phaseDeg.value).toBeCloseTo(-20, 9);
  });

  it('is absent where a sample is zero, and has no phase for levels alone', () => {
    const [found] = closure(Float64Array.of(1, 0), Float64Array.of(0, 0));
    expect(found!.levelDb).toEqual({ kind: 'absent', because: 'the last sample of the turn is zero' });
    expect(levelClosure(-10, -10.5)).toMatchObject({
      levelDb: { value: -0.5 },
      phaseDeg: { kind: 'absent' },
    });
  });

  it('refuses traces that do not belong together', () => {
    expect(() => closure(new Float64Array(2), new Float64Array(4))).toThrow(PatternError);
    expect(() => closure(Float64Array.of(1, Number.NaN), Float64Array.of(1, 0))).toThrow(PatternError);
  });
});
