import { describe, expect, it } from 'vitest';
import { aliasFreePathM, windowedResolutionM } from '../../../../daemon/pattern/path-resolution.ts';
import { PatternError } from '../../../../daemon/pattern/pattern-error.ts';

describe('what a grid tells of path lengths', () => {
  it('is about 4.8 m behind the window for 100 MHz', () => {
    // c/B is 2.998 m; widths of 1.4049 and 0.8859 bins are 1.586 apart.
    expect(windowedResolutionM(100e6)).toBeCloseTo(4.754, 3);
  });

  it('needs a span and a step', () => {
    expect(() => windowedResolutionM(0)).toThrow(PatternError);
    expect(() => aliasFreePathM(-1)).toThrow(PatternError);
  });
});
