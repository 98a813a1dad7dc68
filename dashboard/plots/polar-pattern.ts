// The polar pattern as a plot option: angle clockwise from the top, level in dB relative to the highest of
// the shown cuts. DOM-free, so that reports draw with it too.
import { cutStyles, type PlotColours, type PlotOption } from './palette.ts';

export interface PatternCurve {
  name: string;
  anglesDeg: readonly number[];
  levelDb: readonly number[];
}

/** Levels below the range are drawn on its rim: a smaller radius would flip through the centre. */
export function polarPatternOption(
  curves: readonly PatternCurve[],
  rangeDb: number,
  colours: PlotColours,
): PlotOption {
  const highest = Math.max(...curves.map((curve) => Math.max(...curve.levelDb)));
  return {
    animation: false,
    polar: { radius: '74%', center: ['50%', '47%'] },
    legend: { bottom: 0, textStyle: { color: colours.text }, data: curves.map((curve) => curve.name) },
    angleAxis: {
      type: 'value',
      min: 0,
      max: 360,
      startAngle: 90,
      clockwise: true,
      interval: 30,
      axisLabel: { color: colours.text, formatter: (deg: number) => `${deg > 180 ? deg - 360 : deg}°` },
      axisLine: { lineStyle: { color: colours.grid } },
      splitLine: { lineStyle: { color: colours.grid } },
    },
    radiusAxis: {
      min: -rangeDb,
      max: 0,
      interval: 10,
      axisLabel: { color: colours.text, formatter: (db: number) => (db === 0 ? '' : `${db}`) },
      axisLine: { show: false },
      axisTick: { show: false },
      splitLine: { lineStyle: { color: colours.grid } },
    },
    series: curves.map((curve, index) => {
      const style = cutStyles[index % cutStyles.length];
      return {
        name: curve.name,
        type: 'line',
        coordinateSystem: 'polar',
        showSymbol: false,
        lineStyle: { width: 2, ...style },
        itemStyle: { color: style?.color },
        data: closedCurve(curve, highest, rangeDb),
      };
    }),
  };
}

function closedCurve(curve: PatternCurve, highestDb: number, rangeDb: number): [number, number][] {
  const points = curve.anglesDeg.map((angleDeg, index): [number, number] => [
    Math.max(-rangeDb, (curve.levelDb[index] ?? -rangeDb) - highestDb),
    (angleDeg + 360) % 360,
  ]);
  const first = curve.anglesDeg[0] ?? 0;
  const last = curve.anglesDeg.at(-1) ?? 0;
  const step = Math.abs((curve.anglesDeg[1] ?? first) - first);
  const isTurn = 360 - Math.abs(last - first) <= 1.5 * step;
  return isTurn && points[0] ? [...points, points[0]] : points;
}
