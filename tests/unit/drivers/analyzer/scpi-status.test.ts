import { describe, expect, it } from 'vitest';
import { errorOf, isCurable } from '../../../../drivers/analyzer/scpi-status.ts';
import { DriverError } from '../../../../drivers/errors.ts';

function codeOf(...codes: number[]): string | undefined {
  return errorOf(
    codes.map((code) => ({ code, text: 'words' })),
    'a test',
  )?.code;
}

describe('entries of the error queue', () => {
  // Classes of codes: SCPI-1999, volume 2, chapter 21.8.
  it.each([
    [-113, 'ANALYZER_COMMAND_REFUSED'],
    [-222, 'ANALYZER_COMMAND_REFUSED'],
    [-240, 'ANALYZER_DEVICE_ERROR'],
    [-310, 'ANALYZER_DEVICE_ERROR'],
    [-350, 'ANALYZER_DEVICE_ERROR'],
    [-410, 'ANALYZER_OUT_OF_STEP'],
    [-500, 'ANALYZER_POWER_CYCLED'],
    [103, 'ANALYZER_DEVICE_ERROR'],
  ])('%i is %s', (code, expected) => expect(codeOf(code)).toBe(expected));

  it('that are mere events are no error', () => {
    expect(codeOf(-600, -700, -800)).toBeUndefined();
    expect(codeOf()).toBeUndefined();
  });

  it('count by the oldest that is more than an overflow', () => {
    expect(codeOf(-350, -800, -113)).toBe('ANALYZER_COMMAND_REFUSED');
    expect(
      errorOf(
        [
          { code: -113, text: 'a' },
          { code: -350, text: 'b' },
        ],
        'x',
      )?.facts,
    ).toMatchObject({
      scpiCode: -113,
      entriesLost: true,
      entries: 2,
    });
  });

  it('are listed, the first few', () => {
    const many = Array.from({ length: 7 }, (_, i) => ({ code: -113, text: `X${i}` }));
    expect(errorOf(many, 'setting')?.message).toBe(
      'setting: the instrument reports -113 X0; -113 X1; -113 X2; -113 X3; and 3 more',
    );
  });

  it('can be cured when they refuse a start or call a trace stale', () => {
    const curable = [-213, -230, -222].map((code) => isCurable(errorOf([{ code, text: '' }], 'x')));
    expect(curable).toEqual([true, true, false]);
    expect(isCurable(new DriverError('ANALYZER_BAD_ANSWER', 'x'))).toBe(false);
  });
});
