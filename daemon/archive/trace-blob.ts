// The raw traces of one sample as bytes, and back, bit for bit: −0, subnormals and NaN patterns included.
// Version 1, all numbers little-endian:
//
//    0  magic 'NCtr'          6  parameters, one byte each, 0 for none     16  traces in that order,
//    4  version 1            10  two zero bytes                                16·N bytes each: re, im, re, im …
//    5  count of traces      12  points N, uint32                         end  CRC-32 of all before, uint32
import { endianness } from 'node:os';
import { crc32 } from 'node:zlib';
import type { SParameter } from '../../drivers/analyzer/analyzer.ts';
import { DaemonError } from '../errors.ts';

export type Traces = ReadonlyMap<SParameter, Float64Array>;

/** Whose blob it is, for the error. */
export interface BlobPlace {
  run: number;
  sequence: number;
}

const magic = 'NCtr';
const version = 1;
const headBytes = 16;
const idsAt = 6;
const pointsAt = 12;
const checksumBytes = 4;
/** The number of a parameter in the blob is its place here, counted from 1. Also the order of traces. */
const parameters: readonly SParameter[] = ['S11', 'S21', 'S12', 'S22'];

/** Traces in the order the archive keeps, whatever order the map has. */
export function tracesInOrder(traces: Traces): [SParameter, Float64Array][] {
  return parameters.flatMap((name): [SParameter, Float64Array][] => {
    const values = traces.get(name);
    return values === undefined ? [] : [[name, values]];
  });
}

/** The float64s as little-endian bytes, in memory of their own. */
export function littleEndianBytes(values: Float64Array): Buffer {
  const bytes = Buffer.from(new Uint8Array(values.buffer, values.byteOffset, values.byteLength));
  return endianness() === 'LE' ? bytes : bytes.swap64();
}

function floatsOf(bytes: Uint8Array): Float64Array {
  // An array with a buffer of its own: it can be handed to another thread, and holds no larger blob alive.
  const values = new Float64Array(bytes.length / 8);
  const target = Buffer.from(values.buffer);
  target.set(bytes);
  if (endianness() !== 'LE') target.swap64();
  return values;
}

/** N of the traces. Throws DEFECT unless there is at least one and all have the same whole, even length. */
export function pointsOf(traces: Traces): number {
  const lengths = new Set([...traces.values()].map((values) => values.length));
  const [length = 0] = lengths;
  if (lengths.size !== 1 || length < 2 || length % 2 !== 0 || tracesInOrder(traces).length !== traces.size) {
    throw new DaemonError('DEFECT', 'a sample needs complex traces of one and the same length', {
      parameters: [...traces.keys()].join(' '),
      lengths: [...lengths].join(' '),
    });
  }
  return length / 2;
}

export function encodeTraces(traces: Traces): Buffer {
  const points = pointsOf(traces);
  const ordered = tracesInOrder(traces);
  const head = Buffer.alloc(headBytes);
  head.write(magic, 'latin1');
  head.writeUInt8(version, magic.length);
  head.writeUInt8(ordered.length, magic.length + 1);
  const ids = ordered.map(([name]) => parameters.indexOf(name) + 1);
  head.set(ids, idsAt);
  head.writeUInt32LE(points, pointsAt);
  const body = Buffer.concat([head, ...ordered.map(([, values]) => littleEndianBytes(values))]);
  const checksum = Buffer.alloc(checksumBytes);
  checksum.writeUInt32LE(crc32(body));
  return Buffer.concat([body, checksum]);
}

/** Throws ARCHIVE_DAMAGED with the run and sequence when anything in the blob is not as it was written. */
export function decodeTraces(blob: Uint8Array, place: BlobPlace): Map<SParameter, Float64Array> {
  const bytes = Buffer.from(blob.buffer, blob.byteOffset, blob.byteLength);
  const { names, points } = decodeHead(bytes, place);
  const end = headBytes + names.length * points * 16;
  demand(bytes.length === end + checksumBytes, place, `has ${bytes.length} bytes`);
  demand(crc32(bytes.subarray(0, end)) === bytes.readUInt32LE(end), place, 'fails its checksum');
  return new Map(
    names.map((name, i) => {
      const from = headBytes + i * points * 16;
      return [name, floatsOf(bytes.subarray(from, from + points * 16))];
    }),
  );
}

function decodeHead(bytes: Buffer, place: BlobPlace): { names: SParameter[]; points: number } {
  demand(bytes.length >= headBytes + checksumBytes, place, `has only ${bytes.length} bytes`);
  demand(bytes.toString('latin1', 0, magic.length) === magic, place, 'does not begin as one');
  const found = bytes.readUInt8(magic.length);
  demand(found === version, place, `has version ${found}, known is ${version}`);
  const count = bytes.readUInt8(magic.length + 1);
  demand(count >= 1 && count <= parameters.length, place, `claims ${count} traces`);
  const ids = [...bytes.subarray(idsAt, pointsAt)];
  const names = ids.slice(0, count).map((id) => parameters[id - 1]);
  const known = names.filter((name) => name !== undefined);
  demand(new Set(known).size === count, place, 'names its parameters wrongly');
  demand(
    ids.slice(count).every((id) => id === 0),
    place,
    'has bytes where there are none',
  );
  const points = bytes.readUInt32LE(pointsAt);
  demand(points >= 1, place, 'has no points');
  return { names: known, points };
}

function demand(holds: boolean, { run, sequence }: BlobPlace, but: string): asserts holds {
  if (holds) return;
  const message = `the traces of run ${run}, sequence ${sequence} are damaged: the blob ${but}`;
  const remedy = 'restore this run from a backup; the samples beside it can still be read';
  throw new DaemonError('ARCHIVE_DAMAGED', message, { run, sequence, remedy });
}
