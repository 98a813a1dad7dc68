import { describe, expect, it } from 'vitest';
import { parseRangeFile } from '../../../../daemon/files/parse-range-file.ts';
import { dialectNamed } from '../../../../drivers/analyzer/scpi-dialects.ts';
import { refusalOf } from './refusal.ts';
import { rangeLines, spoiled, whole } from './written-files.ts';

const parse = (text: string) => parseRangeFile(text, '/site/range.yaml');

describe('a range file', () => {
  it('comes out as values with units', () => {
    const text = whole(rangeLines);
    expect(parse(text)).toStrictEqual({
      path: '/site/range.yaml',
      text,
      name: 'river-meadow',
      rangeLengthM: 6,
      heights: { rangeAntennaM: 3, autM: 2.5 },
      analyzer: {
        link: { kind: 'tcp', host: '127.0.0.1', port: 5025 },
        dialect: dialectNamed('numbered-parameter'),
        autPort: 1,
        trace: { format: 'real64', byteOrder: 'swapped' },
      },
      positioner: {
        link: { kind: 'tcp', host: '::1', port: 5026 },
        family: 'realtime-status',
        axes: [
          {
            name: 'azimuth',
            word: 'X',
            unitsPerDegree: 8.889,
            travelMinDeg: -200,
            travelMaxDeg: 200,
            rateDegPerS: 20,
            accelerationDegPerS2: 40,
            approachFrom: 'below',
            approachDeg: 2,
            settleMs: 200,
            toleranceDeg: 0.05,
            homing: 'none',
            sense: -1,
            boresightDeg: 1.5,
          },
          {
            name: 'elevation',
            word: 'Y',
            unitsPerDegree: -1,
            travelMinDeg: -10,
            travelMaxDeg: 95,
            rateDegPerS: 5,
            accelerationDegPerS2: 10,
            approachFrom: 'above',
            approachDeg: 1,
            settleMs: 1000,
            toleranceDeg: 0.1,
            homing: 'switch',
            sense: 1,
            boresightDeg: 0,
          },
        ],
      },
      rangeAntenna: 'telemetry panel, range end',
      reference: {
        name: 'half-wave dipole',
        stated: 'ieee',
        table: [
          { frequencyHz: 820_000_000, gainDbi: 2.1 },
          { frequencyHz: 920_000_000, gainDbi: 2.2 },
        ],
        uncertaintyDb: 0.2,
      },
      archive: '/site/data/nightcut.sqlite',
    });
  });

  it('takes what a check before the night needs', () => {
    const known = [
      [
        'rangeLength: 6 m',
        'nearestWall: 4 m',
        'autOffset: 0 cm',
        'cableLoss: 3.5 dB',
        'cautionLimit: 0.2 mW/cm2',
      ],
      ['  autPort: 1', '  noiseFloor: { level: -110 dBm, ifBandwidth: 1 kHz }'],
      [
        '  rangeAntenna: telemetry panel, range end',
        '  rangeAntennaSize: 40 cm',
        '  rangeAntennaGain: 9 dBi',
      ],
      ['    name: half-wave dipole', '    size: 165 mm'],
    ];
    const lines = rangeLines.map((line) => known.find(([first]) => first === line)?.join('\n') ?? line);
    const range = parse(whole(lines));
    expect(range).toMatchObject({
      nearestWallM: 4,
      autOffsetM: 0,
      cableLossDb: 3.5,
      cautionLimitWM2: 2,
      analyzer: { noiseFloor: { levelDbm: -110, ifBandwidthHz: 1000 } },
      rangeAntennaSizeM: 0.4,
      rangeAntennaGainDbi: 9,
      reference: { sizeM: 0.165 },
    });
    for (const [from, to] of [
      ['autOffset: 0 cm', 'autOffset: -1 cm'],
      ['rangeAntennaSize: 40 cm', 'rangeAntennaSize: 0 m'],
      ['cautionLimit: 0.2 mW/cm2', 'cautionLimit: 28 V/m'],
    ] as const) {
      const { message } = refusalOf(() => parse(whole(lines).replace(from, to)));
      expect(message).toContain(from.split(':')[0]);
    }
  });

  it('does without what is optional', () => {
    const dropped = [3, 4, 5, 10, 11, 12, 28, 34, 35, 36, 37, 38, 39, 40, 41, 42];
    const range = parse(whole(rangeLines.filter((_, i) => !dropped.includes(i + 1))));
    expect('heights' in range).toBe(false);
    expect('reference' in range).toBe(false);
    expect(range.analyzer.trace).toStrictEqual({ format: 'real64', byteOrder: 'normal' });
    expect(range.positioner.axes[0]?.boresightDeg).toBe(0);
    expect(range.archive).toBe('/site/nightcut.sqlite');
  });

  it('is the same with byte order mark, carriage returns, comments and anchors', () => {
    const plain = parse(whole(rangeLines));
    const dressed = `\uFEFF# ours\n${whole(rangeLines)}`.replaceAll('\n', '\r\n');
    expect({ ...parse(dressed), text: '' }).toStrictEqual({ ...plain, text: '' });
    const anchored = spoiled(rangeLines, 4, '  rangeAntenna: &h 2.5 m').replace('aut: 2.5 m', 'aut: *h');
    expect(parse(anchored).heights).toStrictEqual({ rangeAntennaM: 2.5, autM: 2.5 });
  });
});

// [line replaced, by (undefined: left out), line told, what follows the line]
const wrong: [number, string | undefined, number, string][] = [
  [1, 'range:', 1, 'range: expected the name of the range of 1 to 40 characters; found nothing'],
  [1, undefined, 1, 'range: expected the name of the range of 1 to 40 characters; found nothing'],
  [
    1,
    'range: "a\\u0007b"',
    1,
    'range: expected the name of the range of 1 to 40 characters; found "a\\u0007b" (no control',
  ],
  [
    1,
    `range: ${'x'.repeat(41)}`,
    1,
    'range: expected the name of the range of 1 to 40 characters; found "xxx',
  ],
  [2, 'rangeLength: 6', 2, 'rangeLength: expected a length with unit such as 6 m; found 6'],
  [
    2,
    'rangeLength: 0 m',
    2,
    'rangeLength: expected a length with unit such as 6 m, above 0 m and up to 100 km; found "0 m"',
  ],
  [
    2,
    'rangeLength: 6,5 m',
    2,
    'rangeLength: expected a length with unit such as 6 m; found "6,5 m" (write the decimals',
  ],
  [2, 'rangeLenght: 6 m', 2, 'unknown key `rangeLenght`; did you mean `rangeLength`?'],
  [2, 'rangeLength: [6 m]', 2, 'rangeLength: expected a length with unit such as 6 m; found a list'],
  [
    2,
    'rangeLength: .nan',
    2,
    'rangeLength: expected a length with unit such as 6 m; found ".nan" (only finite',
  ],
  [2, 'range: meadow', 2, 'key `range` is given twice, first in line 1'],
  [3, 'heights: 3 m', 3, 'expected YAML; '],
  [4, '\trangeAntenna: 3 m', 4, 'expected spaces at the start of the line; found a tab'],
  [4, undefined, 3, 'heights.rangeAntenna: expected a length with unit such as 6 m; found nothing'],
  [
    5,
    '  aut: -2 m',
    5,
    'heights.aut: expected a length with unit such as 6 m, above 0 m and up to 1 km; found "-2 m"',
  ],
  [6, 'analyser:', 6, 'unknown key `analyser`; did you mean `analyzer`?'],
  [
    7,
    '  link: serial:/dev/ttyUSB0',
    7,
    'analyzer.link: expected a link such as tcp://192.168.1.20:5025 or serial:///dev/ttyACM0?baud=115200; found "serial:/dev/ttyUSB0" (a serial link is serial://',
  ],
  [7, '  link: tcp://127.0.0.1:99999', 7, 'analyzer.link: expected a link such as'],
  [
    7,
    '  link: tcp://[::1]:5026',
    14,
    'positioner.link: expected another address than analyzer.link; found "tcp://[::1]:5026"',
  ],
  [8, '  dialect: Numbered Parameter', 8, 'analyzer.dialect: expected '],
  [8, '  dialect: hand-made', 8, 'analyzer.dialect: expected '],
  [9, '  autPort: 3', 9, 'analyzer.autPort: expected a whole number from 1 to 2; found 3'],
  [9, '  autPort: 1.0', 9, 'analyzer.autPort: expected a whole number from 1 to 2; found 1.0'],
  [11, '    format: real', 11, 'analyzer.trace.format: expected one of real64, real32, ascii; found "real"'],
  [
    11,
    '    format: [real64]',
    11,
    'analyzer.trace.format: expected one of real64, real32, ascii; found a list',
  ],
  [12, '    byteorder: swapped', 12, 'analyzer.trace: unknown key `byteorder`; did you mean `byteOrder`?'],
  [12, '    colour: red', 12, 'analyzer.trace: unknown key `colour`; known here: format, byteOrder'],
  [
    14,
    undefined,
    13,
    'positioner.link: expected a link such as tcp://192.168.1.20:5025 or serial:///dev/ttyACM0?baud=115200; found nothing',
  ],
  [
    15,
    '  family: position-reports',
    15,
    'positioner.family: expected one of realtime-status, position-report; found "position-reports"',
  ],
  [
    15,
    '  family: constructor',
    15,
    'positioner.family: expected one of realtime-status, position-report; found "constructor"',
  ],
  [17, '    Azimuth:', 17, 'positioner.axes.Azimuth: expected an axis name such as azimuth'],
  [17, '    constructor:', 17, 'positioner.axes.constructor: expected an axis name such as azimuth'],
  [
    18,
    '      word: x',
    18,
    'positioner.axes.azimuth.word: expected one of X, Y, Z, A, B, C, U, V, W; found "x"',
  ],
  [
    18,
    '      word: Y',
    29,
    'positioner.axes.elevation.word: expected another letter than that of axis azimuth; found "Y"',
  ],
  [
    19,
    '      unitsPerDegree: 0',
    19,
    'positioner.axes.azimuth.unitsPerDegree: expected a number other than 0; found 0',
  ],
  [
    19,
    '      unitsPerDegree: 8 steps',
    19,
    'positioner.axes.azimuth.unitsPerDegree: expected controller units per degree such as 8.889 units/deg; found "8 steps"',
  ],
  [
    20,
    '      travel: { min: 200 deg, max: -200 deg }',
    20,
    'positioner.axes.azimuth.travel.max: expected an angle above travel.min, 200 deg; found "-200 deg"',
  ],
  [
    20,
    '      travel: { min: 5 deg, max: 200 deg }',
    28,
    'positioner.axes.azimuth.boresight: expected an angle within travel, 5 deg to 200 deg; found "1.5 deg"',
  ],
  [
    20,
    '      travel: { min: 0 deg, max: 200 deg }',
    23,
    'positioner.axes.azimuth.approach.by: expected at most the 1.5 deg of travel below boresight; found "2 deg"',
  ],
  [
    20,
    '      travel: { min: -200 deg }',
    20,
    'positioner.axes.azimuth.travel.max: expected an angle with unit such as 1 deg; found nothing',
  ],
  [
    21,
    '      rate: 20 deg',
    21,
    'positioner.axes.azimuth.rate: expected a turning rate with unit such as 20 deg/s; found "20 deg"',
  ],
  [
    21,
    '      rate: 0 deg/s',
    21,
    'positioner.axes.azimuth.rate: expected a turning rate with unit such as 20 deg/s, above 0',
  ],
  [
    22,
    '      acceleration: 40 deg/s',
    22,
    'positioner.axes.azimuth.acceleration: expected an angular acceleration',
  ],
  [
    23,
    '      approach: { from: left, by: 2 deg }',
    23,
    'positioner.axes.azimuth.approach.from: expected one of below, above; found "left"',
  ],
  [24, '      setle: 200 ms', 24, 'positioner.axes.azimuth: unknown key `setle`; did you mean `settle`?'],
  [
    24,
    undefined,
    17,
    'positioner.axes.azimuth.settle: expected a duration with unit such as 250 ms; found nothing',
  ],
  [
    24,
    '      settle: 200 MS',
    24,
    'positioner.axes.azimuth.settle: expected a duration with unit such as 250 ms; found "200 MS" (upper and lower',
  ],
  [
    25,
    '      tolerance: 0 deg',
    25,
    'positioner.axes.azimuth.tolerance: expected an angle with unit such as 1 deg, above 0',
  ],
  [26, '      homing: yes', 26, 'positioner.axes.azimuth.homing: expected one of switch, none; found "yes"'],
  [27, '      sense: 2', 27, 'positioner.axes.azimuth.sense: expected +1 or -1; found 2'],
  [
    28,
    '      boresight: 1',
    28,
    'positioner.axes.azimuth.boresight: expected an angle with unit such as 1 deg; found 1',
  ],
  [
    33,
    undefined,
    32,
    'antennas.rangeAntenna: expected the name of the range antenna of 1 to 80 characters; found nothing',
  ],
  [
    33,
    '  rangeAntenna: { name: panel }',
    33,
    'antennas.rangeAntenna: expected the name of the range antenna of 1 to 80 characters; found keys with values',
  ],
  [
    37,
    '      stated: IEEE',
    37,
    'antennas.reference.gain.stated: expected one of ieee, realized; found "IEEE"',
  ],
  [
    38,
    '      uncertainty: 0.2 dBi',
    38,
    'antennas.reference.gain.uncertainty: expected a level difference with unit such as 0.2 dB; found "0.2 dBi" (write dB)',
  ],
  [
    40,
    '        - { at: 820 MHz, gain: 2.1 }',
    40,
    'antennas.reference.gain.table[0].gain: expected a gain with unit such as 2.15 dBi; found 2.1',
  ],
  [
    40,
    '        - { at: 820 MHz, gain: 0 dBd }',
    40,
    'antennas.reference.gain.table[0].gain: expected a gain with unit such as 2.15 dBi; found "0 dBd" (gain over a half-wave dipole',
  ],
  [
    40,
    '        - { at: 820 mHz, gain: 2.1 dBi }',
    40,
    'antennas.reference.gain.table[0].at: expected a frequency with unit such as 868 MHz; found "820 mHz" (mHz is',
  ],
  [
    40,
    '        - { at: 950 MHz, gain: 2.1 dBi }',
    41,
    'antennas.reference.gain.table[1].at: expected frequencies in ascending order, none twice; found "0.92 GHz"',
  ],
  [
    41,
    '        - { at: 820 MHz, gain: 2.2 dBi }',
    41,
    'antennas.reference.gain.table[1].at: expected frequencies in ascending order',
  ],
  [
    41,
    '        - 2.1 dBi',
    41,
    'antennas.reference.gain.table[1]: expected a mapping with at, gain; found "2.1 dBi"',
  ],
  [42, 'archive: [a, b', 42, 'expected YAML; '],
  [
    42,
    'archive: ',
    42,
    'archive: expected the path of the archive file of 1 to 1000 characters; found nothing',
  ],
  [42, '---', 42, 'expected one document; found a second one after ---'],
  [42, 'archive: *nowhere', 1, 'expected anchors to stand before their use; found the use of an unknown one'],
  [42, '__proto__: 1', 42, 'unknown key `__proto__`; known here: range, rangeLength,'],
  [42, '? [a, b]\n: 1', 42, 'expected a word as key; found something else'],
];

describe('a wrong range file', () => {
  it.each(wrong)('line %i as %j is told in line %i: %s', (line, by, told, text) => {
    const error = refusalOf(() => parse(spoiled(rangeLines, line, by)));
    expect(error.code).toBe('FILE_INVALID');
    expect(error.message.startsWith(`/site/range.yaml:${told}: ${text}`), error.message).toBe(true);
    expect(error.facts['line']).toBe(told);
  });

  it('tells the first of several, and keeps all', () => {
    const text = spoiled(rangeLines, 2, 'rangeLength: 6')
      .replace('format: real64', 'format: real')
      .replace('homing: none', 'homming: none');
    const error = refusalOf(() => parse(text));
    expect(error.message).toBe(
      '/site/range.yaml:2: rangeLength: expected a length with unit such as 6 m; found 6 (and 2 more)',
    );
    expect(error.facts['count']).toBe(3);
    expect(String(error.facts['problems']).split('\n')).toStrictEqual([
      '/site/range.yaml:2: rangeLength: expected a length with unit such as 6 m; found 6',
      '/site/range.yaml:11: analyzer.trace.format: expected one of real64, real32, ascii; found "real"',
      '/site/range.yaml:26: positioner.axes.azimuth: unknown key `homming`; did you mean `homing`?',
    ]);
  });

  it('tells a mistyped key beside the wrong value of the right one', () => {
    const error = refusalOf(() => parse(spoiled(rangeLines, 24, '      settle: 200\n      setle: 200 ms')));
    expect(String(error.facts['problems']).split('\n')).toStrictEqual([
      '/site/range.yaml:24: positioner.axes.azimuth.settle: expected a duration with unit such as 250 ms; found 200',
      '/site/range.yaml:25: positioner.axes.azimuth: unknown key `setle`; did you mean `settle`?',
    ]);
  });

  it('tells the line through an alias', () => {
    const text = spoiled(rangeLines, 4, '  rangeAntenna: &h 25').replace('aut: 2.5 m', 'aut: *h');
    expect(refusalOf(() => parse(text)).message).toContain(
      'range.yaml:4: heights.rangeAntenna: expected a length',
    );
  });

  it('keeps names of files from breaking the line', () => {
    const error = refusalOf(() => parseRangeFile('', 'a\nb.yaml'));
    expect(error.message).toBe('a\\u000ab.yaml:1: expected keys with values; found nothing');
  });
});
