// The polar plot's option: where points lie, what is closed, what is drawn at the centre.
import { describe, expect, it } from 'vitest';
import { lightColours } from '../../../../dashboard/plots/palette.ts';
import { type PatternCurve, polarPatternOption } from '../../../../dashboard/plots/polar-pattern.ts';

interface Drawn {
  angleAxis: { clockwise: boolean; startAngle: number; axisLabel: { formatter: (deg: number) => string } };
  radiusAxis: { min: number; max: number; axisLabel: { formatter: (db: number) => string } };
  legend: { data: string[] };
  series: { name: string; data: [radiusDb: number, angleDeg: number][]; lineStyle: { color: string } }[];
}

function drawn(curves: PatternCurve[], rangeDb = 40): Drawn {
  return polarPatternOption(curves, rangeDb, lightColours) as unknown as Drawn;
}

const anglesOf = (fromDeg: number, toDeg: number, stepDeg: number): number[] =>
  Array.from({ length: Math.round((toDeg - fromDeg) / stepDeg) + 1 }, (_, k) => fromDeg + k * stepDeg);
const flat = (anglesDeg: number[], level = 0): PatternCurve => ({
  name: 'flat',
  anglesDeg,
  levelDb: anglesDeg.map(() => level),
});

describe('the polar plot', () => {
  it('puts 0° at the top and turns clockwise', () => {
    const { angleAxis } = drawn([flat(anglesOf(-90, 90, 90))]);
    expect(angleAxis).toMatchObject({ startAngle: 90, clockwise: true });
    expect([0, 90, 180, 210, 270].map(angleAxis.axisLabel.formatter)).toEqual([
      '0°',
      '90°',
      '180°',
      '−150°',
      '−90°',
    ]);
  });

  it('counts levels from the highest of all curves', () => {
    const curves = [flat([-1, 0, 1], -47), { name: 'b', anglesDeg: [-1, 0, 1], levelDb: [-50, -45, -52] }];
    const { series } = drawn(curves);
    expect(series[0]?.data.map(([radius]) => radius)).toEqual([-2, -2, -2]);
    expect(series[1]?.data).toEqual([
      [-5, 359],
      [0, 0],
      [-7, 1],
    ]);
  });

  it('draws at the centre what lies below its range', () => {
    const { series, radiusAxis } = drawn([{ name: 'a', anglesDeg: [0, 10, 20], levelDb: [0, -39, -400] }]);
    expect(series[0]?.data.map(([radius]) => radius)).toEqual([0, -39, -40]);
    expect(radiusAxis).toMatchObject({ min: -40, max: 0 });
    expect([-40, -30, 0].map(radiusAxis.axisLabel.formatter)).toEqual(['', '−30', '']);
  });

  it.each([
    ['a full turn every 5°', anglesOf(-175, 180, 5), true],
    ['a full turn whose end is missing, by one and a half steps at most', anglesOf(0, 350, 7), true],
    ['a turn with a gap of two steps', anglesOf(0, 340, 10), false],
    ['half a turn', anglesOf(-90, 90, 1), false],
    ['a cut across 180°, as travelled', anglesOf(150, 210, 1), false],
  ])('closes a turn and leaves a part open: %s', (_, anglesDeg, closed) => {
    const points = drawn([flat(anglesDeg)]).series[0]!.data;
    expect(points).toHaveLength(anglesDeg.length + (closed ? 1 : 0));
    if (closed) expect(points.at(-1)).toEqual(points[0]);
    for (const [, angleDeg] of points) {
      expect(angleDeg).toBeGreaterThanOrEqual(0);
      expect(angleDeg).toBeLessThan(360);
    }
  });

  it('names every curve and gives each another colour, and draws none where there is none', () => {
    const names = ['azimuth', 'elevation', 'roll 45°', 'roll 90°', 'roll 135°'];
    const { series, legend } = drawn(names.map((name) => ({ ...flat([0, 1, 2]), name })));
    expect(legend.data).toEqual(names);
    expect(new Set(series.map(({ lineStyle }) => lineStyle.color)).size).toBe(names.length);
    expect(drawn([]).series).toEqual([]);
  });
});
