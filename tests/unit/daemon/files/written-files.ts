// A valid range file and a valid plan with one key per line, for tests that spoil single lines.

export const rangeLines: readonly string[] = [
  /*  1 */ 'range: river-meadow',
  /*  2 */ 'rangeLength: 6 m',
  /*  3 */ 'heights:',
  /*  4 */ '  rangeAntenna: 3 m',
  /*  5 */ '  aut: 2.5 m',
  /*  6 */ 'analyzer:',
  /*  7 */ '  link: tcp://127.0.0.1:5025',
  /*  8 */ '  dialect: numbered-parameter',
  /*  9 */ '  autPort: 1',
  /* 10 */ '  trace:',
  /* 11 */ '    format: real64',
  /* 12 */ '    byteOrder: swapped',
  /* 13 */ 'positioner:',
  /* 14 */ '  link: tcp://[::1]:5026',
  /* 15 */ '  family: realtime-status',
  /* 16 */ '  axes:',
  /* 17 */ '    azimuth:',
  /* 18 */ '      word: X',
  /* 19 */ '      unitsPerDegree: 8.889 units/deg',
  /* 20 */ '      travel: { min: -200 deg, max: 200° }',
  /* 21 */ '      rate: 20 deg/s',
  /* 22 */ '      acceleration: 40 deg/s2',
  /* 23 */ '      approach: { from: below, by: 2 deg }',
  /* 24 */ '      settle: 0.2 s',
  /* 25 */ '      tolerance: 0.05 deg',
  /* 26 */ '      homing: none',
  /* 27 */ '      sense: -1',
  /* 28 */ '      boresight: 1.5 deg',
  /* 29 */ '    elevation: { word: Y, unitsPerDegree: -1, travel: { min: -10 deg, max: 95 deg }, rate: 5 deg/s,',
  /* 30 */ '      acceleration: 10 deg/s2, approach: { from: above, by: 1 deg }, settle: 1 s, tolerance: 0.1 deg,',
  /* 31 */ '      homing: switch, sense: +1 }',
  /* 32 */ 'antennas:',
  /* 33 */ '  rangeAntenna: telemetry panel, range end',
  /* 34 */ '  reference:',
  /* 35 */ '    name: half-wave dipole',
  /* 36 */ '    gain:',
  /* 37 */ '      stated: ieee',
  /* 38 */ '      uncertainty: 0.2 dB',
  /* 39 */ '      table:',
  /* 40 */ '        - { at: 820 MHz, gain: 2.10 dBi }',
  /* 41 */ '        - { at: 0.92 GHz, gain: 2.2 dBi }',
  /* 42 */ 'archive: data/nightcut.sqlite',
];

export const planLines: readonly string[] = [
  /*  1 */ 'antenna:',
  /*  2 */ '  name: river-gauge yagi',
  /*  3 */ '  revision: 1.10',
  /*  4 */ 'kind: pattern',
  /*  5 */ 'band:',
  /*  6 */ '  from: 820 MHz',
  /*  7 */ '  to: 920 MHz',
  /*  8 */ '  points: 201',
  /*  9 */ 'markers: [868 MHz, 915 MHz]',
  /* 10 */ 'analyzer:',
  /* 11 */ '  ifBandwidth: 1 kHz',
  /* 12 */ '  power: -10 dBm',
  /* 13 */ '  averages: 2',
  /* 14 */ 'gainReference: 7',
  /* 15 */ 'cuts:',
  /* 16 */ '  - name: azimuth',
  /* 17 */ '    axis: azimuth',
  /* 18 */ '    plane: H',
  /* 19 */ '    from: -180 deg',
  /* 20 */ '    to: 180 deg',
  /* 21 */ '    step: 1 deg',
  /* 22 */ '    at:',
  /* 23 */ '      elevation: 5 deg',
  /* 24 */ '    autRoll: 90 deg',
  /* 25 */ '    component: cross',
  /* 26 */ '  - { name: tilt, axis: elevation, plane: E, from: -30 deg, to: 60 deg, step: 2.5 deg }',
  /* 27 */ 'ties:',
  /* 28 */ '  every: 30',
  /* 29 */ 'checks:',
  /* 30 */ '  closure: 0.3 dB',
  /* 31 */ '  drift: 0.4 dB',
];

/** The text with line `line` (1 is the first) replaced; undefined leaves it out. */
export function spoiled(lines: readonly string[], line: number, by: string | undefined): string {
  const changed = lines.flatMap((text, i) => (i + 1 !== line ? [text] : by === undefined ? [] : [by]));
  return `${changed.join('\n')}\n`;
}

/** The text of the file as it should be. */
export function whole(lines: readonly string[]): string {
  return `${lines.join('\n')}\n`;
}
