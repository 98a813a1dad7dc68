// The plot over the band: points in MHz, gaps, marker lines and the dot at the shown frequency.
import { describe, expect, it } from 'vitest';
import {
  type BandCurve,
  levelOverFrequencyOption,
} from '../../../../dashboard/plots/level-over-frequency.ts';
import { darkColours } from '../../../../dashboard/plots/palette.ts';

interface Drawn {
  yAxis: { name: string };
  series: { data: [number, number | null][]; markLine?: { data: { xAxis: number }[] } }[];
}

const curve: BandCurve = {
  name: 'return loss',
  frequenciesHz: [820e6, 868e6, 920e6],
  levelDb: [12, undefined, 3],
  markersHz: [868e6, 915e6],
  shownIndex: 2,
};
const drawn = (change: Partial<BandCurve> = {}): Drawn =>
  levelOverFrequencyOption({ ...curve, ...change }, darkColours) as unknown as Drawn;

describe('the plot over the band', () => {
  it('draws megahertz and decibels and leaves a gap where there is no figure', () => {
    expect(drawn().yAxis.name).toBe('return loss in dB');
    expect(drawn().series[0]?.data).toEqual([
      [820, 12],
      [868, null],
      [920, 3],
    ]);
  });

  it('marks the marker frequencies', () => {
    expect(drawn().series[0]?.markLine?.data).toEqual([{ xAxis: 868 }, { xAxis: 915 }]);
  });

  it.each([
    [2, [[920, 3]]],
    [1, []],
    [7, []],
  ])('puts a dot at the shown frequency, none where there is no figure: %i', (shownIndex, dot) => {
    expect(drawn({ shownIndex }).series[1]?.data).toEqual(dot);
  });
});
