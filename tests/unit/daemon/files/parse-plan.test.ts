import { describe, expect, it } from 'vitest';
import { parsePlan } from '../../../../daemon/files/parse-plan.ts';
import { refusalOf } from './refusal.ts';
import { planLines, spoiled, whole } from './written-files.ts';

const parse = (text: string) => parsePlan(text, '/site/yagi.plan.yaml');

const shortPlan = `antenna: { name: half-wave dipole, revision: A }
kind: reference
band: { from: 820 MHz, to: 920 MHz, points: 201 }
analyzer: { ifBandwidth: 1 kHz, power: -10 dBm }
`;

describe('a plan', () => {
  it('comes out as values with units', () => {
    const text = whole(planLines);
    expect(parse(text)).toStrictEqual({
      path: '/site/yagi.plan.yaml',
      text,
      kind: 'pattern',
      antenna: { name: 'river-gauge yagi', revision: '1.10' },
      band: { startHz: 820_000_000, stopHz: 920_000_000, points: 201 },
      markersHz: [868_000_000, 915_000_000],
      analyzer: { ifBandwidthHz: 1000, powerDbm: -10, averages: 2 },
      gainReference: 7,
      cuts: [
        {
          name: 'azimuth',
          axis: 'azimuth',
          plane: 'H',
          fromDeg: -180,
          toDeg: 180,
          stepDeg: 1,
          at: { elevation: 5 },
          autRollDeg: 90,
          component: 'cross',
        },
        {
          name: 'tilt',
          axis: 'elevation',
          plane: 'E',
          fromDeg: -30,
          toDeg: 60,
          stepDeg: 2.5,
          at: {},
          autRollDeg: 0,
          component: 'co',
        },
      ],
      tieEverySamples: 30,
      checks: { closureDb: 0.3, driftDb: 0.4 },
    });
  });

  it('of kind reference needs no cuts', () => {
    expect(parse(shortPlan)).toMatchObject({
      kind: 'reference',
      gainReference: 'none',
      cuts: [],
      markersHz: [],
      tieEverySamples: 60,
      analyzer: { averages: 1 },
      checks: { closureDb: 0.2, driftDb: 0.5 },
    });
  });

  it('takes its gain from the latest reference unless told otherwise', () => {
    expect(parse(spoiled(planLines, 14, undefined)).gainReference).toBe('latest');
    expect(parse(spoiled(planLines, 14, 'gainReference: none')).gainReference).toBe('none');
  });

  it('takes a step with ten digits for the exact one', () => {
    // 360/7 = 51.428571428…
    const plan = parse(spoiled(planLines, 21, '    step: 51.42857143 deg'));
    expect(plan.cuts[0]?.stepDeg).toBe(360 / 7);
  });
});

// [line replaced, by (undefined: left out), line told, what follows the line]
const wrong: [number, string | undefined, number, string][] = [
  [
    2,
    '  name: "a\\tb"',
    2,
    'antenna.name: expected the name of the antenna of 1 to 80 characters; found "a\\u0009b" (no control characters)',
  ],
  [2, '  name: "a\\nb"', 2, 'antenna.name: expected the name of the antenna'],
  [2, '  name: "a\\u202eb"', 2, 'antenna.name: expected the name of the antenna'],
  [2, '  name: " yagi"', 2, 'antenna.name: expected the name of the antenna'],
  [3, undefined, 1, 'antenna.revision: expected a revision of 1 to 40 characters; found nothing'],
  [4, 'kind: patern', 4, 'kind: expected one of pattern, reference; found "patern"'],
  [
    4,
    'kind: reference',
    14,
    'gainReference: expected none in a plan of kind reference; found 7 (a reference run takes',
  ],
  [6, '  from: 820', 6, 'band.from: expected a frequency with unit such as 868 MHz; found 820'],
  [6, '  from: 920 MHz', 7, 'band.to: expected a frequency above band.from; found "920 MHz"'],
  [7, '  to: 10 THz', 7, 'band.to: expected a frequency with unit such as 868 MHz; found "10 THz"'],
  [8, '  points: 1', 8, 'band.points: expected a whole number from 2 to 20001; found 1'],
  [8, '  points: 20002', 8, 'band.points: expected a whole number from 2 to 20001; found 20002'],
  [8, '  points: 201.5', 8, 'band.points: expected a whole number from 2 to 20001; found 201.5'],
  [8, '  points: many', 8, 'band.points: expected a whole number from 2 to 20001; found "many"'],
  [9, 'markers: [868 MHz, 921 MHz]', 9, 'markers[1]: expected a frequency within the band; found "921 MHz"'],
  [
    9,
    'markers:\n  - 868 MHz\n  - 819 MHz',
    11,
    'markers[1]: expected a frequency within the band; found "819 MHz"',
  ],
  [9, 'markers: [868 MHz, 0.868 GHz]', 9, 'markers[1]: expected every marker once; found "0.868 GHz"'],
  [9, 'markers: 868 MHz', 9, 'markers: expected a list of frequencies such as [868 MHz]; found "868 MHz"'],
  [9, 'marker: [868 MHz]', 9, 'unknown key `marker`; did you mean `markers`?'],
  [11, '  ifbandwidth: 1 kHz', 11, 'analyzer: unknown key `ifbandwidth`; did you mean `ifBandwidth`?'],
  [
    11,
    '  ifBandwidth: 1 KHz',
    11,
    'analyzer.ifBandwidth: expected a frequency with unit such as 868 MHz; found "1 KHz" (upper',
  ],
  [
    12,
    '  power: -10 dB',
    12,
    'analyzer.power: expected a power with unit such as -10 dBm; found "-10 dB" (write dBm)',
  ],
  [
    12,
    '  power: 40 dBm',
    12,
    'analyzer.power: expected a power with unit such as -10 dBm, from -120 to 30 dBm; found "40 dBm"',
  ],
  [13, '  averages: 0', 13, 'analyzer.averages: expected a whole number from 1 to 10000; found 0'],
  [
    14,
    'gainReference: newest',
    14,
    'gainReference: expected latest, none or the number of a reference run; found "newest"',
  ],
  [14, 'gainReference: 0', 14, 'gainReference: expected latest, none or the number'],
  [16, '  - name:', 16, 'cuts[0].name: expected the name of the cut of 1 to 60 characters; found nothing'],
  [16, '  - name: Tilt', 26, 'cuts[1].name: expected another name than that of cuts[0]; found "tilt"'],
  [17, '    axis: Azimuth', 17, 'cuts[0].axis: expected an axis name such as azimuth'],
  [18, '    plane: e', 18, 'cuts[0].plane: expected one of E, H, other; found "e"'],
  [18, undefined, 16, 'cuts[0].plane: expected one of E, H, other; found nothing'],
  [19, '    from: -181 deg', 20, 'cuts[0].to: expected an angle at most 360 deg above from; found "180 deg"'],
  [19, '    from: 180 deg', 20, 'cuts[0].to: expected an angle above from; found "180 deg"'],
  [
    19,
    '    from: -400 deg',
    19,
    'cuts[0].from: expected an angle with unit such as 1 deg, from -360 to 360 deg; found "-400 deg"',
  ],
  [21, '    step: 0 deg', 21, 'cuts[0].step: expected an angle with unit such as 1 deg, above 0'],
  [
    21,
    '    step: 7 deg',
    21,
    'cuts[0].step: expected a step that divides the 360 deg of the cut, such as 7.05882352941 deg or 6.92307692308 deg; found "7 deg"',
  ],
  [
    21,
    '    step: 0.001 deg',
    21,
    'cuts[0].step: expected at most 36000 steps in a cut: 0.01 deg or more; found "0.001 deg"',
  ],
  [
    22,
    '    at: 5 deg\n    x:',
    22,
    'cuts[0].at: expected a mapping of the other axes to angles, such as { elevation: 0 deg }; found "5 deg"',
  ],
  [23, '      elevation: 5', 23, 'cuts[0].at.elevation: expected an angle with unit such as 1 deg; found 5'],
  [
    23,
    '      azimuth: 5 deg',
    23,
    'cuts[0].at.azimuth: expected only the other axes: azimuth is swept; found "5 deg"',
  ],
  [25, '    component: left', 25, 'cuts[0].component: expected one of co, cross; found "left"'],
  [
    26,
    '  - { name: tilt, axis: elevation, plane: E, from: 0 deg, to: 1 deg, step: 2 deg }',
    26,
    'cuts[1].step: expected a step that divides the 1 deg of the cut, such as 1 deg; found "2 deg"',
  ],
  [26, '  - tilt', 26, 'cuts[1]: expected a mapping with name, axis,'],
  [28, '  every: 0', 28, 'ties.every: expected a whole number from 1 to 100000; found 0'],
  [28, '  each: 30', 28, 'ties: unknown key `each`; known here: every'],
  [
    30,
    '  closure: 0 dB',
    30,
    'checks.closure: expected a level difference with unit such as 0.2 dB, above 0',
  ],
  [
    31,
    '  drift: 0,5 dB',
    31,
    'checks.drift: expected a level difference with unit such as 0.2 dB; found "0,5 dB" (write the decimals after a point',
  ],
  [31, '  drift: !!float 1', 31, 'expected YAML; '],
];

describe('what is expected of the antenna', () => {
  it('stands beside its name, and is no part of it', () => {
    const written = planLines.map((line) =>
      line === '  revision: 1.10' ? `${line}\n  size: 52 cm\n  expectedGain: 11.1 dBi` : line,
    );
    const plan = parse(whole(written));
    expect(plan.expected).toStrictEqual({ sizeM: 0.52, gainDbi: 11.1 });
    expect(plan.antenna).toStrictEqual({ name: 'river-gauge yagi', revision: '1.10' });
    expect('expected' in parse(whole(planLines))).toBe(false);
  });
});

describe('a wrong plan', () => {
  it.each(wrong)('line %i as %j is told in line %i: %s', (line, by, told, text) => {
    const error = refusalOf(() => parse(spoiled(planLines, line, by)));
    expect(error.code).toBe('FILE_INVALID');
    expect(error.message.startsWith(`/site/yagi.plan.yaml:${told}: ${text}`), error.message).toBe(true);
  });

  it('of kind pattern needs a cut', () => {
    const error = refusalOf(() =>
      parse(`${shortPlan.replace('kind: reference', 'kind: pattern')}cuts: []\n`),
    );
    expect(error.message).toBe(
      '/site/yagi.plan.yaml:5: cuts: expected at least one cut in a plan of kind pattern; found an empty list',
    );
  });

  it('advises steps that it then accepts', () => {
    for (const step of ['7 deg', '0.37 deg', '359 deg', '11.11 deg']) {
      const { message } = refusalOf(() => parse(spoiled(planLines, 21, `    step: ${step}`)));
      const advised = /such as ([^;]+);/.exec(message)?.[1]?.split(' or ') ?? [];
      expect(advised).toHaveLength(2);
      for (const better of advised) {
        expect(parse(spoiled(planLines, 21, `    step: ${better}`)).cuts).toHaveLength(2);
      }
    }
  });
});
