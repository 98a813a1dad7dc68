import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { damageMark, LineSplitter } from '../../../../drivers/link/lines.ts';

const bytes = (text: string): Uint8Array => Uint8Array.from(text, (letter) => letter.charCodeAt(0));

describe('LineSplitter', () => {
  it('ends lines at LF and CR LF, and keeps empty ones', () => {
    const splitter = new LineSplitter();
    expect(splitter.push(bytes('ok\r\n\r\nerror:9\nhalf'))).toEqual(['ok', '', 'error:9']);
    expect(splitter.push(bytes(' line\n'))).toEqual(['half line']);
  });

  it('drops junk ahead of a line and marks junk inside it', () => {
    const splitter = new LineSplitter();
    expect(splitter.push(bytes('\x00\xffok\n'))).toEqual(['ok']);
    expect(splitter.push(bytes('erro\x91r:2\nerror:2\xf8\n'))).toEqual([
      `erro${damageMark}r:2`,
      `error:2${damageMark}`,
    ]);
  });

  it('caps a line that never ends and marks it, then goes on with the next', () => {
    const splitter = new LineSplitter(8);
    expect(splitter.push(bytes('x'.repeat(100_000)))).toEqual([]);
    expect(splitter.push(bytes('\nok\n12345678\n'))).toEqual([`xxxxxxxx${damageMark}`, 'ok', '12345678']);
  });

  it('forgets half a line on clear', () => {
    const splitter = new LineSplitter();
    splitter.push(bytes('<Idle|MP'));
    splitter.clear();
    expect(splitter.push(bytes('ok\n'))).toEqual(['ok']);
  });

  it('gives the same lines however the bytes are cut', () => {
    fc.assert(
      fc.property(fc.uint8Array({ maxLength: 200 }), fc.integer({ min: 1, max: 20 }), (all, size) => {
        const whole = new LineSplitter(16).push(all);
        const cut = new LineSplitter(16);
        const pieces: string[] = [];
        for (let at = 0; at < all.length; at += size) pieces.push(...cut.push(all.subarray(at, at + size)));
        expect(pieces).toEqual(whole);
      }),
    );
  });
});
