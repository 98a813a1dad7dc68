import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  decodeBlock,
  decodeBoolean,
  decodeErrorEntry,
  decodeIdentity,
  decodeNumber,
  decodeNumberList,
  decodeSetting,
  decodeWord,
  excerpt,
} from '../../../../drivers/analyzer/scpi-values.ts';

describe('numbers', () => {
  it.each([
    ['1000', 1000],
    ['+1.5', 1.5],
    [' -10 ', -10],
    ['.5', 0.5],
    ['5.', 5],
    ['+8.68000000000E+08', 868e6],
    ['1e-3', 0.001],
    ['2E 9', 2e9],
  ])('%s', (text, value) => expect(decodeNumber(text)).toBe(value));

  // Overflow values: SCPI-1999, volume 1, 7.2.1.4 and 7.2.1.5.
  it.each([
    ['NaN', Number.NaN],
    ['nan', Number.NaN],
    ['9.91E37', Number.NaN],
    ['9.91E+37', Number.NaN],
    ['INF', Infinity],
    ['NINF', -Infinity],
    ['-INF', -Infinity],
    ['inf', Infinity],
    ['9.9E37', Infinity],
    ['+9.90000E+37', Infinity],
    ['-9.9E37', -Infinity],
  ])('%s is no data', (text, value) => {
    expect(decodeNumber(text)).toBe(value);
    expect(() => decodeSetting(text)).toThrow(expect.objectContaining({ code: 'ANALYZER_BAD_ANSWER' }));
  });

  it.each(['', ' ', 'ON', '1,2', '1;2', '0x10', '1 000', '--1', '1e', '"1"', 'Infinity1'])(
    'refuses %j',
    (text) => {
      expect(() => decodeNumber(text)).toThrow(expect.objectContaining({ code: 'ANALYZER_BAD_ANSWER' }));
    },
  );

  it('reads any list, with or without blanks', () => {
    fc.assert(
      fc.property(
        fc.array(fc.double({ noNaN: true, noDefaultInfinity: true, min: -1e30, max: 1e30 }), {
          minLength: 1,
        }),
        fc.constantFrom(',', ', ', ' ,', ',  '),
        (numbers, comma) => {
          const text = numbers.map((n) => n.toExponential()).join(comma);
          expect(Array.from(decodeNumberList(text))).toEqual(numbers.map((n) => Number(n.toExponential())));
        },
      ),
    );
  });

  it('refuses a list with a hole', () => {
    expect(() => decodeNumberList('1,,2')).toThrow(expect.objectContaining({ code: 'ANALYZER_BAD_ANSWER' }));
  });
});

describe('words and switches', () => {
  it('normalizes words', () => {
    expect(decodeWord(' real, 64')).toBe('REAL,64');
    expect(decodeWord('"S21"')).toBe('S21');
  });
  it('reads switches', () => {
    expect(['1', 'ON', '+1', 'on', '0', 'OFF'].map(decodeBoolean)).toEqual([
      true,
      true,
      true,
      true,
      false,
      false,
    ]);
    expect(() => decodeBoolean('2')).toThrow(expect.objectContaining({ code: 'ANALYZER_BAD_ANSWER' }));
  });
});

describe('blocks', () => {
  // Seen on the wire with an instrument set to REAL,64 / REAL,32: its first value is 2.44186263453E-02.
  it('reads doubles and floats in both orders as seen on the wire', () => {
    const wire64 = Uint8Array.of(0x3f, 0x99, 0x01, 0x32, 0x46, 0x43, 0xd7, 0xa5);
    expect(decodeBlock(wire64, 8, 'normal')[0]).toBeCloseTo(2.44186263453e-2, 13);
    expect(decodeBlock(wire64.toReversed(), 8, 'swapped')[0]).toBeCloseTo(2.44186263453e-2, 13);
    const wire32 = Uint8Array.of(0x92, 0x09, 0xc8, 0x3c);
    expect(decodeBlock(wire32, 4, 'swapped')[0]).toBeCloseTo(2.44186e-2, 6);
    expect(decodeBlock(wire32.toReversed(), 4, 'normal')[0]).toBeCloseTo(2.44186e-2, 6);
  });

  it('does not mind where in a buffer the block stands', () => {
    const buffer = Buffer.alloc(9 + 8);
    buffer.writeDoubleBE(0.25, 9);
    expect(Array.from(decodeBlock(buffer.subarray(9), 8, 'normal'))).toEqual([0.25]);
  });

  it('refuses a length that does not divide', () => {
    expect(() => decodeBlock(new Uint8Array(12), 8, 'normal')).toThrow(
      expect.objectContaining({ code: 'ANALYZER_BAD_BLOCK' }),
    );
  });
});

describe('error entries', () => {
  it.each([
    ['0,"No error"', 0, 'No error'],
    ['+0,"No error"', 0, 'No error'],
    ['-0, "No error"', 0, 'No error'],
    ['0', 0, ''],
    ['-113,"Undefined header;FREQU:STAR?"', -113, 'Undefined header;FREQU:STAR?'],
    ['-224,"Illegal ""X"", see list"', -224, 'Illegal "X", see list'],
    ["+103,'lost, lock'", 103, 'lost, lock'],
    ['-350,Queue overflow', -350, 'Queue overflow'],
  ])('%s', (line, code, text) => expect(decodeErrorEntry(line)).toEqual({ code, text }));

  it('refuses other lines', () => {
    for (const line of ['EXAMPLE,2PORT,1,2', '1000.5', '']) {
      expect(() => decodeErrorEntry(line)).toThrow(expect.objectContaining({ code: 'ANALYZER_BAD_ANSWER' }));
    }
  });
});

describe('identity', () => {
  it('leaves commas to the firmware', () => {
    expect(decodeIdentity('EXAMPLE, 2PORT-SIM,0001,0.1,build 7,x')).toEqual({
      maker: 'EXAMPLE',
      model: '2PORT-SIM',
      serial: '0001',
      firmware: '0.1,build 7,x',
    });
  });
  it('accepts empty fields, but not fewer', () => {
    expect(decodeIdentity('"A,B,,"')).toEqual({ maker: 'A', model: 'B', serial: '', firmware: '' });
    expect(() => decodeIdentity('A,B,1')).toThrow(expect.objectContaining({ code: 'ANALYZER_BAD_ANSWER' }));
  });
});

it('shows control characters', () => {
  expect(excerpt('a\r\x00b')).toBe('a\\x0d\\x00b');
  expect(excerpt('x'.repeat(100), 10)).toBe(`${'x'.repeat(10)}…`);
});
