// A quantity over the band as a plot option, such as return loss: the curve, the marker frequencies as
// upright lines, and a dot at the frequency that is looked at. DOM-free.
import { axisNumber, cutStyle, type PlotColours, type PlotOption } from './palette.ts';

export interface BandCurve {
  name: string;
  /** N frequencies in Hz, ascending. */
  frequenciesHz: readonly number[];
  /** N levels in dB; undefined leaves a gap. */
  levelDb: readonly (number | undefined)[];
  markersHz: readonly number[];
  /** Index of the frequency that is looked at. */
  shownIndex: number;
}

export function levelOverFrequencyOption(curve: BandCurve, colours: PlotColours): PlotOption {
  const points = curve.frequenciesHz.map((hz, index) => [hz / 1e6, curve.levelDb[index] ?? null]);
  const shown = points[curve.shownIndex];
  const { color } = cutStyle(0);
  return {
    animation: false,
    grid: { left: 44, right: 20, top: 44, bottom: 46 },
    xAxis: {
      type: 'value',
      min: 'dataMin',
      max: 'dataMax',
      name: 'MHz',
      nameLocation: 'middle',
      nameGap: 28,
      nameTextStyle: { color: colours.text },
      axisLabel: { color: colours.text, hideOverlap: true, formatter: axisNumber },
      splitLine: { lineStyle: { color: colours.grid } },
    },
    yAxis: {
      type: 'value',
      name: `${curve.name} in dB`,
      nameGap: 24,
      nameTextStyle: { color: colours.text, align: 'left', padding: [0, 0, 0, -30] },
      axisLabel: { color: colours.text, formatter: axisNumber },
      splitLine: { lineStyle: { color: colours.grid } },
    },
    series: [
      {
        name: curve.name,
        type: 'line',
        symbol: 'none',
        silent: true,
        lineStyle: { width: 2, color },
        data: points,
        markLine: {
          symbol: 'none',
          silent: true,
          lineStyle: { color: colours.text, type: 'dotted' },
          label: { color: colours.text, formatter: '{c}' },
          data: curve.markersHz.map((hz) => ({ xAxis: hz / 1e6 })),
        },
      },
      {
        name: 'shown frequency',
        type: 'line',
        symbol: 'circle',
        symbolSize: 9,
        silent: true,
        itemStyle: { color },
        data: shown && shown[1] !== null ? [shown] : [],
      },
    ],
  };
}
