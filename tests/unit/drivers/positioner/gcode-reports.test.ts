// Lines as real firmwares of the family were seen to send them (two of them, 3 to 6 axes).
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { alarmMeaning, refusalMeaning } from '../../../../drivers/positioner/gcode-meanings.ts';
import {
  isHeld,
  isMoving,
  machinePosition,
  planeInParserState,
  readLine,
  readReport,
} from '../../../../drivers/positioner/gcode-reports.ts';

describe('readReport', () => {
  it.each([
    ['<Idle|MPos:0.000,0.000,0.000|FS:0,0|WCO:0.000,0.000,0.000>', 'Idle', undefined, [0, 0, 0]],
    ['<Run|MPos:2.863,0.000,0.000|FS:1800,0|Ov:100,100,100>', 'Run', undefined, [2.863, 0, 0]],
    ['<Hold:1|MPos:20.763,0.000,0.000|FS:120,0>', 'Hold', 1, [20.763, 0, 0]],
    ['<Door:2|MPos:7.525,-0.000>', 'Door', 2, [7.525, 0]],
    ['<Run|MPos:0.000,0.000,0.000,5.338|Bf:99,1023|FS:1800,0|H:0>', 'Run', undefined, [0, 0, 0, 5.338]],
    [
      '<Alarm:11|MPos:0.000,0.000,0.000,0.000|Bf:100,1023|FS:0,0|WCO:0.000,0.000,0.000,0.000|WCS:G54|A:|Sc:|AR|FW:x>',
      'Alarm',
      11,
      [0, 0, 0, 0],
    ],
    [
      '<Idle|MPos:1.000,2.000,3.000,4.000,5.000,-6.500|New:7,seven>',
      'Idle',
      undefined,
      [1, 2, 3, 4, 5, -6.5],
    ],
  ])('reads %s', (text, state, sub, machine) => {
    expect(readReport(text)).toMatchObject({ state, sub, machine });
  });

  it('tells feed override and active inputs', () => {
    const report = readReport('<Idle|MPos:0.000,0.000,0.000|Pn:XD|Ov:10,100,100>');
    expect(report).toMatchObject({ feedOverridePercent: 10, pins: 'XD' });
  });

  it.each([
    '<Idle|MPos:0.000,0.0\uFFFD0,0.000>',
    '<Idle|MPos:0.000,,0.000>',
    '<Idle|MPos:0.000,0.000,0.000',
    '<Idle|MPos:1.2.3,0.000,0.000>',
    '<Idle|MPos:1.0,0.0<Idle|MPos:0.000,0.000>',
    '<Idle|MPos:0.000,0.000|WCO:0.000>',
    '<Idle|FS:0,0>',
    '<Idle,MPos:0.000,0.000,0.000,WPos:0.000,0.000,0.000>',
  ])('refuses the damaged or foreign %s', (text) => {
    expect(readReport(text)).toBeUndefined();
    expect(readLine(text).kind).toBe('unknown');
  });

  it('never throws and never takes a cut report for a whole one', () => {
    const whole = '<Hold:0|MPos:21.200,0.000,0.000|FS:0,0|Ov:100,100,100>';
    for (let length = 0; length < whole.length; length += 1)
      expect(readReport(whole.slice(0, length))).toBeUndefined();
    fc.assert(fc.property(fc.string(), (text) => readLine(text).kind.length > 0));
  });
});

describe('machinePosition', () => {
  it('is work position plus offset, the newest offset known', () => {
    // Seen: machine 10 with offset −5 shows work 15.
    const work = readReport('<Idle|WPos:15.000,0.000,0.000|FS:0,0>')!;
    expect(machinePosition(work, undefined)).toBeUndefined();
    expect(machinePosition(work, [-5, 0])).toBeUndefined();
    expect(machinePosition(work, [-5, 0, 0])).toEqual([10, 0, 0]);
    const both = readReport('<Idle|WPos:15.000,0.000,0.000|WCO:1.000,0.000,0.000>')!;
    expect(machinePosition(both, [-5, 0, 0])).toEqual([16, 0, 0]);
  });
});

describe('readLine', () => {
  it.each([
    ['ok', { kind: 'ok' }],
    ['error:46', { kind: 'error', number: 46 }],
    ['ALARM:3', { kind: 'alarm', number: 3 }],
    ["Grbl 1.1h ['$' for help]", { kind: 'banner' }],
    ["GrblHAL 1.1f ['$' or '$HELP' for help]", { kind: 'banner' }],
    ["[MSG:'$H'|'$X' to unlock]", { kind: 'message', text: "'$H'|'$X' to unlock" }],
    ['[MSG:]', { kind: 'message', text: '' }],
    ['[VER:1.1h.20190830:]', { kind: 'data', key: 'VER', value: '1.1h.20190830:' }],
    ['[OPT:V,15,128]', { kind: 'data', key: 'OPT', value: 'V,15,128' }],
    ['$100=250.000', { kind: 'setting', number: 100, value: '250.000' }],
    ['$1=25 (step idle delay, msec)', { kind: 'setting', number: 1, value: '25' }],
    ['>G20:error:9', { kind: 'startup' }],
    ['', { kind: 'empty' }],
    ['start', { kind: 'foreign' }],
    ['echo:Unknown command: "?"', { kind: 'foreign' }],
    ['X:0.00 Y:0.00 Z:0.00 E:0.00 Count X:0 Y:0 Z:0', { kind: 'foreign' }],
    ['okok', { kind: 'unknown' }],
    ['o\uFFFD', { kind: 'unknown' }],
    ['error:', { kind: 'unknown' }],
    ['$100=80.\uFFFD', { kind: 'unknown' }],
  ])('tells %s', (text, expected) => {
    expect(readLine(text)).toMatchObject(expected);
  });
});

describe('states', () => {
  it.each([
    ['Run', true, false],
    ['Jog', true, false],
    ['Hold:1', true, true],
    ['Hold:0', false, true],
    ['Door:1', false, true],
    ['Door:2', true, true],
    ['Idle', false, false],
    ['Alarm', false, false],
  ])('%s: moving %s, held %s', (state, moving, held) => {
    const report = readReport(`<${state}|MPos:0.000>`)!;
    expect([isMoving(report), isHeld(report)]).toEqual([moving, held]);
  });

  it('reads the plane of a parser state, not another word', () => {
    expect(planeInParserState('G0 G54 G17 G21 G90 G94 M5 M9 T0 F600 S0')).toBe(17);
    expect(planeInParserState('G1 G54 G18 G21 G90 G94 G40 G49 G98 G50 M5 M9 T0 F1800 S0.')).toBe(18);
    expect(planeInParserState('G0 G54')).toBeUndefined();
    expect(planeInParserState('G0 G180')).toBeUndefined();
  });
});

describe('meanings', () => {
  it('knows after which alarms the counter still tells the place', () => {
    const known = [...Array(30).keys()].filter((number) => alarmMeaning(number).positionKnown);
    // Soft limit and the two probe alarms; everything else needs homing (firmware sources).
    expect(known).toEqual([2, 4, 5]);
    expect([1, 2].map((number) => alarmMeaning(number).wayOut)).toEqual(['reset', 'reset']);
  });

  it('keeps numbers it does not know', () => {
    expect(alarmMeaning(77).meaning).toContain('77');
    expect(refusalMeaning(199)).toContain('199');
  });
});
