// Letters and numbers of a line; eight digits count, as recorded from a real controller.
import { describe, expect, it } from 'vitest';
import { condensed, readNumber, wordsOf } from '../../../../mocks/positioner/gcode-words.ts';

describe('readNumber', () => {
  it('passes over digits past the eighth, leading zeros included', () => {
    expect(readNumber('12.3456789', 0)).toEqual({ value: 12.345678, next: 10 });
    expect(readNumber('123456789', 0)).toEqual({ value: 123456780, next: 9 });
    expect(readNumber('0.00000000001', 0)?.value).toBe(0);
  });

  it('reads signs and bare points, and knows no exponents', () => {
    expect(readNumber('-.5', 0)).toEqual({ value: -0.5, next: 3 });
    expect(readNumber('+7.', 0)).toEqual({ value: 7, next: 3 });
    expect(readNumber('1E2', 0)).toEqual({ value: 1, next: 1 });
    expect(readNumber('-', 0)).toBeUndefined();
    expect(readNumber('.', 0)).toBeUndefined();
  });
});

describe('condensed and wordsOf', () => {
  it('drops spaces, comments, the block-delete sign and what follows a semicolon', () => {
    expect(condensed('/g1 (to the left) x-1.5 ; F9')).toBe('G1X-1.5');
  });

  it('splits words and names the fault', () => {
    expect(wordsOf('G1X-1.5')).toEqual([
      { letter: 'G', value: 1 },
      { letter: 'X', value: -1.5 },
    ]);
    expect(wordsOf('G1X')).toEqual({ error: 2 });
    expect(wordsOf('1')).toEqual({ error: 1 });
    expect(wordsOf('G0*7')).toEqual({ error: 1 });
  });
});
