import { describe, expect, it } from 'vitest';
import { InThreadArchive } from '../../../../daemon/archive/in-thread-archive.ts';
import type { Plan } from '../../../../daemon/files/plan-file.ts';
import type { RangeFile } from '../../../../daemon/files/range-file.ts';
import { orderRun } from '../../../../daemon/run/order-run.ts';
import { fakeAxis } from '../../../support/fake-devices.ts';

const range = {
  path: 'range.yaml',
  text: 'range text',
  name: 'meadow',
  rangeLengthM: 6,
  analyzer: { autPort: 2 },
  positioner: { axes: [{ ...fakeAxis(), sense: 1, boresightDeg: 5 }] },
  reference: {
    name: 'dipole',
    stated: 'ieee',
    table: [
      { frequencyHz: 820e6, gainDbi: 2.1 },
      { frequencyHz: 920e6, gainDbi: 2.2 },
    ],
  },
} as unknown as RangeFile;

const plan = {
  path: 'reference.plan.yaml',
  text: 'plan text',
  kind: 'reference',
  antenna: { name: 'dipole', revision: 'A' },
  band: { startHz: 820e6, stopHz: 920e6, points: 11 },
  markersHz: [],
  analyzer: { ifBandwidthHz: 1000, powerDbm: 0, averages: 1 },
  gainReference: 'none',
  cuts: [],
  tieEverySamples: 60,
  checks: { closureDb: 0.2, driftDb: 0.5 },
} as Plan;

describe('the order of a run', () => {
  it('freezes both files and asks for the parameters of the port in use', async () => {
    const archive = InThreadArchive.open(':memory:');
    const order = await orderRun(range, plan).complete(archive);
    await archive.close();
    expect(order.record).toMatchObject({ kind: 'reference', planText: 'plan text', rangeText: 'range text' });
    expect(order.sweep.parameters).toEqual(['S21', 'S22']);
    expect(order.boresight).toEqual({ azimuth: 5 });
    expect(order.steps).toHaveLength(5);
  });

  it('refuses a reference run without a reference antenna', () => {
    const { reference: _, ...bare } = range;
    expect(() => orderRun(bare as RangeFile, plan)).toThrow(
      expect.objectContaining({ code: 'REFERENCE_MISSING' }),
    );
  });

  it.each([
    [810e6, 920e6],
    [820e6, 921e6],
  ])('refuses a reference run from %d to %d Hz, beyond the gain table', (startHz, stopHz) => {
    const wide: Plan = { ...plan, band: { ...plan.band, startHz, stopHz } };
    expect(() => orderRun(range, wide)).toThrow(expect.objectContaining({ code: 'REFERENCE_DOES_NOT_FIT' }));
  });
});
