// A quantity over the band as a plot option, such as return loss. DOM-free.
import { cutStyles, type PlotColours, type PlotOption } from './palette.ts';

export function levelOverFrequencyOption(
  name: string,
  frequenciesHz: readonly number[],
  levelDb: readonly (number | undefined)[],
  markersHz: readonly number[],
  colours: PlotColours,
): PlotOption {
  return {
    animation: false,
    grid: { left: 56, right: 24, top: 24, bottom: 48 },
    xAxis: {
      type: 'value',
      min: 'dataMin',
      max: 'dataMax',
      name: 'MHz',
      nameLocation: 'middle',
      nameGap: 28,
      nameTextStyle: { color: colours.text },
      axisLabel: { color: colours.text, hideOverlap: true },
      splitLine: { lineStyle: { color: colours.grid } },
    },
    yAxis: {
      type: 'value',
      name: `${name} in dB`,
      nameTextStyle: { color: colours.text, align: 'left' },
      axisLabel: { color: colours.text },
      splitLine: { lineStyle: { color: colours.grid } },
    },
    series: [
      {
        name,
        type: 'line',
        showSymbol: false,
        lineStyle: { width: 2, color: cutStyles[0]?.color },
        data: frequenciesHz.map((hz, index) => [hz / 1e6, levelDb[index] ?? null]),
        markLine: {
          symbol: 'none',
          lineStyle: { color: colours.text, type: 'dotted' },
          label: { color: colours.text, formatter: '{c}' },
          data: markersHz.map((hz) => ({ xAxis: hz / 1e6 })),
        },
      },
    ],
  };
}
