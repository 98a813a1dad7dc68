import { createHash } from 'node:crypto';
import { describe, expect, it } from 'vitest';
import type { SampleRecord } from '../../../../daemon/archive/archive.ts';
import { hashSamples } from '../../../../daemon/archive/run-hash.ts';
import { sample } from './records.ts';

describe('hash of a run', () => {
  it('is the SHA-256 of nothing for no samples', () => {
    expect(hashSamples([])).toBe(createHash('sha256').digest('hex'));
  });

  it('knows nothing of times, attempts, segments and setups', () => {
    const other = sample(1, {
      segment: 3,
      setup: 2,
      attempt: 4,
      startMonotonicMs: 1,
      stopMonotonicMs: 2,
      timeLaw: { kind: 'linear', firstMs: 9, lastMs: 10 },
      track: [],
    });
    expect(hashSamples([other])).toBe(hashSamples([sample(1)]));
  });

  it('does not ask in which order samples, axes or traces are handed in', () => {
    const turned = sample(1, {
      target: { elevation: -3, azimuth: 0.1 },
      traces: new Map([...sample(1).traces].reverse()),
    });
    expect(hashSamples([sample(2), turned])).toBe(hashSamples([sample(1), sample(2)]));
  });

  const changes: [string, Partial<SampleRecord>][] = [
    ['sequence', { sequence: 3 }],
    ['purpose', { purpose: 'tie' }],
    ['cut', { cut: 'azimuth2' }],
    ['target', { target: { azimuth: 0.1, elevation: -3.000001 } }],
    ['axis', { axis: 'elevation' }],
    ['angle', { angleDeg: 7 }],
    ['component', { component: 'cross' }],
    ['a trace less', { traces: new Map([...sample(1).traces].slice(0, 1)) }],
    [
      'one bit of a trace',
      { traces: new Map([...sample(1).traces].map(([name, v]) => [name, v.map((x) => (x === 0 ? 0 : x))])) },
    ],
  ];
  it.each(changes)('changes with %s', (_what, change) => {
    expect(hashSamples([sample(1, change)])).not.toBe(hashSamples([sample(1)]));
  });
});
