// The polar pattern as a plot option: angle clockwise from the top, level in dB relative to the highest of
// the shown cuts. DOM-free, so that reports draw with it too.
import { axisNumber, cutStyle, type PlotColours, type PlotOption } from './palette.ts';

export interface PatternCurve {
  name: string;
  /** N pattern angles in degrees, ascending. */
  anglesDeg: readonly number[];
  /** N levels in dB. */
  levelDb: readonly number[];
}

/** Levels further down than `rangeDb` are drawn at the centre: a smaller radius would flip to the other side. */
export function polarPatternOption(
  curves: readonly PatternCurve[],
  rangeDb: number,
  colours: PlotColours,
): PlotOption {
  const highestDb = curves.flatMap((curve) => curve.levelDb).reduce((a, b) => Math.max(a, b), -Infinity);
  return {
    animation: false,
    // The names of many cuts take more than one line below the plot.
    polar:
      curves.length > 3
        ? { radius: '70%', center: ['50%', '42%'] }
        : { radius: '76%', center: ['50%', '46%'] },
    legend: {
      bottom: 0,
      selectedMode: false,
      itemWidth: 36,
      // The line alone, so that its dashes can be told.
      itemStyle: { opacity: 0 },
      textStyle: { color: colours.text },
      data: curves.map((curve) => curve.name),
    },
    angleAxis: {
      type: 'value',
      min: 0,
      max: 360,
      startAngle: 90,
      clockwise: true,
      interval: 30,
      axisLabel: { color: colours.text, formatter: angleLabel },
      axisLine: { lineStyle: { color: colours.grid } },
      splitLine: { lineStyle: { color: colours.grid } },
    },
    radiusAxis: {
      min: -rangeDb,
      max: 0,
      interval: 10,
      axisLabel: {
        color: colours.text,
        // The rim is 0 dB by definition, and a label in the centre would lie on the curves.
        formatter: (db: number) => (db === 0 || db === -rangeDb ? '' : axisNumber(db)),
      },
      axisLine: { show: false },
      axisTick: { show: false },
      splitLine: { lineStyle: { color: colours.grid } },
    },
    series: curves.map((curve, index) => ({
      name: curve.name,
      type: 'line',
      coordinateSystem: 'polar',
      symbol: 'none',
      silent: true,
      lineStyle: { width: 2, ...cutStyle(index) },
      itemStyle: { color: cutStyle(index).color },
      data: closedCurve(curve, highestDb, rangeDb),
    })),
  };
}

function angleLabel(deg: number): string {
  return `${axisNumber(deg > 180 ? deg - 360 : deg)}°`;
}

/** Radius and angle of each sample; a full turn is closed, a part of one is left open. */
function closedCurve(curve: PatternCurve, highestDb: number, rangeDb: number): [number, number][] {
  const points = curve.anglesDeg.map((angleDeg, index): [number, number] => [
    Math.max(-rangeDb, (curve.levelDb[index] ?? -rangeDb) - highestDb),
    ((angleDeg % 360) + 360) % 360,
  ]);
  const first = points[0];
  return first && isTurn(curve.anglesDeg) ? [...points, first] : points;
}

/** The missing part is no more than one and a half of the largest steps: the rule the figures follow. */
function isTurn(anglesDeg: readonly number[]): boolean {
  const steps = anglesDeg.slice(1).map((angleDeg, k) => angleDeg - (anglesDeg[k] ?? angleDeg));
  const spanDeg = steps.reduce((sum, step) => sum + step, 0);
  return 360 - spanDeg <= 1.5 * Math.max(0, ...steps);
}
