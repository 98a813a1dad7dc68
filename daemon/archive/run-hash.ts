// One number for all that a run has measured. It knows nothing of UUIDs and clocks, so that two nights with
// the same seed have the same hash, and a run read back has the hash it was written with.
import { createHash } from 'node:crypto';
import type { SampleRecord } from './archive.ts';
import { littleEndianBytes, tracesInOrder } from './trace-blob.ts';

/**
 * SHA-256, in hex, over the samples in order of sequence: what each was taken for, where, and the bytes of
 * its traces. Every field is preceded by its length or ends a line, so that no two lists share their bytes.
 */
export function hashSamples(samples: readonly SampleRecord[]): string {
  const hash = createHash('sha256');
  for (const sample of [...samples].sort((a, b) => a.sequence - b.sequence)) {
    const { sequence, purpose, cut, axis, angleDeg, component } = sample;
    const target = Object.entries(sample.target).sort(([a], [b]) => (a < b ? -1 : 1));
    hash.update(`${JSON.stringify([sequence, purpose, cut, target, axis, angleDeg, component])}\n`);
    for (const [parameter, values] of tracesInOrder(sample.traces)) {
      hash.update(`${parameter} ${values.byteLength}\n`).update(littleEndianBytes(values));
    }
    hash.update('\n');
  }
  return hash.digest('hex');
}
