import { crc32 } from 'node:zlib';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { decodeTraces, encodeTraces, type Traces } from '../../../../daemon/archive/trace-blob.ts';
import type { SParameter } from '../../../../drivers/analyzer/analyzer.ts';
import { failure } from './records.ts';

const place = { run: 4, sequence: 17 };

function bitsOf(values: Float64Array): bigint[] {
  return [
    ...new BigUint64Array(values.buffer.slice(values.byteOffset, values.byteOffset + values.byteLength)),
  ];
}

/** Any 64 bits at all, and often those that arithmetic would not keep. */
const anyBits = fc.oneof(
  fc.bigInt({ min: 0n, max: (1n << 64n) - 1n }),
  fc.constantFrom(
    0x8000000000000000n, // −0
    0x0000000000000001n, // smallest subnormal
    0x800fffffffffffffn, // a negative subnormal
    0x7ff0000000000001n, // signalling NaN
    0xfff8000000000000n, // negative quiet NaN
    0x7fffffffffffffffn, // NaN with all bits of its payload
    0xfff0000000000000n, // −∞
  ),
);

const anyTraces = fc
  .tuple(
    fc.uniqueArray(fc.constantFrom<SParameter>('S11', 'S21', 'S12', 'S22'), { minLength: 1 }),
    fc.integer({ min: 1, max: 20 }),
  )
  .chain(([names, points]) =>
    fc
      .tuple(...names.map(() => fc.array(anyBits, { minLength: 2 * points, maxLength: 2 * points })))
      .map(
        (bits): Traces =>
          new Map(names.map((name, i) => [name, new Float64Array(BigUint64Array.from(bits[i]!).buffer)])),
      ),
  );

describe('trace blob', () => {
  it('gives back every bit of every trace', () => {
    fc.assert(
      fc.property(anyTraces, (traces) => {
        const decoded = decodeTraces(encodeTraces(traces), place);
        expect([...decoded.keys()].sort()).toEqual([...traces.keys()].sort());
        for (const [name, values] of traces) expect(bitsOf(decoded.get(name)!)).toEqual(bitsOf(values));
      }),
    );
  });

  it('lays version 1 out as documented', () => {
    // Written by hand from the drawing at the head of trace-blob.ts; 1.5 is 3FF8…, −2 is C000… (IEEE 754).
    const body = Buffer.from(
      `4e437472 01 02 01020000 0000 01000000
       000000000000f83f 00000000000000c0
       00000000000000c0 000000000000f83f`.replaceAll(/\s/g, ''),
      'hex',
    );
    const checksum = Buffer.alloc(4);
    checksum.writeUInt32LE(crc32(body));
    const traces: Traces = new Map([
      ['S21', Float64Array.of(-2, 1.5)],
      ['S11', Float64Array.of(1.5, -2)],
    ]);
    expect(encodeTraces(traces).toString('hex')).toBe(Buffer.concat([body, checksum]).toString('hex'));
  });

  it('keeps a view for what it shows, not for the memory behind it', () => {
    const large = Float64Array.from({ length: 100 }, (_, i) => i);
    const decoded = decodeTraces(encodeTraces(new Map([['S21', large.subarray(10, 14)]])), place);
    expect(decoded.get('S21')).toEqual(Float64Array.of(10, 11, 12, 13));
    expect(decoded.get('S21')!.buffer.byteLength).toBe(32);
  });

  it('finds any single changed byte, and names run and sequence', async () => {
    const blob = encodeTraces(new Map([['S21', Float64Array.of(1, 2, 3, 4)]]));
    for (let at = 0; at < blob.length; at += 1) {
      const broken = Buffer.from(blob);
      broken[at]! ^= 0x10;
      const error = await failure('ARCHIVE_DAMAGED', () => decodeTraces(broken, place));
      expect(error.facts).toMatchObject(place);
      expect(error.message).toContain('run 4, sequence 17');
    }
  });

  it('finds any cut and any appended byte', async () => {
    const blob = encodeTraces(new Map([['S21', Float64Array.of(1, 2, 3, 4)]]));
    for (let length = 0; length < blob.length; length += 1) {
      await failure('ARCHIVE_DAMAGED', () => decodeTraces(blob.subarray(0, length), place));
    }
    await failure('ARCHIVE_DAMAGED', () => decodeTraces(Buffer.concat([blob, Buffer.alloc(1)]), place));
  });

  it.each([
    ['another version', 4, 2, 'has version 2, known is 1'],
    ['no trace', 5, 0, 'claims 0 traces'],
    ['five traces', 5, 5, 'claims 5 traces'],
    ['one parameter twice', 7, 1, 'names its parameters wrongly'],
    ['an unknown parameter', 6, 9, 'names its parameters wrongly'],
    ['a third parameter', 8, 1, 'has bytes where there are none'],
    ['reserved bytes in use', 10, 1, 'has bytes where there are none'],
    ['no points', 12, 0, 'has no points'],
    ['more points than bytes', 12, 2, 'has 52 bytes'],
  ])('refuses %s even with a right checksum', async (_what, at, value, because) => {
    const blob = encodeTraces(
      new Map<SParameter, Float64Array>([
        ['S21', Float64Array.of(1, 2)],
        ['S11', Float64Array.of(3, 4)],
      ]),
    );
    blob[at] = value;
    blob.writeUInt32LE(crc32(blob.subarray(0, -4)), blob.length - 4);
    const error = await failure('ARCHIVE_DAMAGED', () => decodeTraces(blob, place));
    expect(error.message).toContain(because);
  });

  it.each<[string, Traces]>([
    ['no traces', new Map()],
    ['an empty trace', new Map([['S21', new Float64Array(0)]])],
    ['half a complex number', new Map([['S21', new Float64Array(3)]])],
    [
      'traces of different length',
      new Map([
        ['S21', new Float64Array(4)],
        ['S11', new Float64Array(2)],
      ]),
    ],
    ['a parameter nobody knows', new Map([['S33' as SParameter, new Float64Array(2)]])],
  ])('does not encode %s', async (_what, traces) => {
    await failure('DEFECT', () => encodeTraces(traces));
  });
});
