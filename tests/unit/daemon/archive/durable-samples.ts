// The samples that durability.test.ts has written by one process and expects in another: as large as real
// ones, each made from its sequence alone.
import type { SampleRecord, SetupRecord } from '../../../../daemon/archive/archive.ts';
import { sample, setup } from './records.ts';

const points = 401;

export const durableSetup: SetupRecord = {
  ...setup,
  sweep: {
    ...setup.sweep,
    frequenciesHz: Float64Array.from({ length: points }, (_, i) => 800e6 + i * 250e3),
  },
};

export function durableSample(sequence: number): SampleRecord {
  const values = Float64Array.from({ length: 2 * points }, (_, i) => Math.sin(sequence * 1000 + i));
  return sample(sequence, { traces: new Map([['S21', values]]) });
}
