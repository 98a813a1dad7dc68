// Lines as a real controller of the family printed them (recorded from a 2.0.x build on an emulated board).
import { describe, expect, it } from 'vitest';
import { numberedLine, readReportLine } from '../../../../drivers/positioner/report-lines.ts';

describe('a line of a position-report controller', () => {
  it.each([
    ['ok', 'ok'],
    ['ok P15 B3', 'ok'],
    ['ok N42 P15 B3', 'ok'],
    ['okay', 'remark'],
    ['ok\uFFFD', 'remark'],
    ['wait', 'wait'],
    ['start', 'start'],
    ['echo:busy: processing', 'busy'],
    ['echo:Unknown command: "G999"', 'unknown-command'],
    ['Error:checksum mismatch, Last Line: 2', 'complaint'],
    ['Error:Line Number is not Last Line Number+1, Last Line: 3', 'complaint'],
    ['Error:No Checksum with line number, Last Line: 3', 'complaint'],
    ['Resend: 3', 'resend'],
    ['Error:Printer halted. kill() called!', 'halted'],
    ['X:0.00 Y:0.00 Z:0.00 E:0.00 Count X:0 Y:0 Z:0', 'position'],
    ['X:0.00 Y:0.0', 'remark'],
    ['X:0.00 Y:0.00 Z:0.00 E:0.00 Count X:0 Y:# Z:0', 'remark'],
    ['Logical: X: 180.000 Y: 0.000 Z: 0.000', 'remark'],
    ['x_min: TRIGGERED', 'remark'],
    ['<Idle|MPos:0.000,0.000,0.000|FS:0,0>', 'foreign'],
    ['error:20', 'foreign'],
    ["Grbl 1.1h ['$' for help]", 'foreign'],
  ])('%s is %s', (text, kind) => {
    expect(readReportLine(text).kind).toBe(kind);
  });

  it('keeps what a position says, counts and all', () => {
    expect(readReportLine('X:12.34 Y:0.00 Z:-5.10 E:0.00 Count X:1242 Y:0 Z:-510')).toEqual({
      kind: 'position',
      units: { X: 12.34, Y: 0, Z: -5.1, E: 0 },
      counts: { X: 1242, Y: 0, Z: -510 },
    });
  });

  it('tells a pause for a person from work', () => {
    expect(readReportLine('echo:busy: paused for user')).toMatchObject({ kind: 'busy', paused: true });
    expect(readReportLine('echo:busy: processing')).toMatchObject({ kind: 'busy', paused: false });
  });

  it.each([
    [1, 'G91', 'N1 G91*16'],
    [3, 'G1 X1 F600', 'N3 G1 X1 F600*50'],
    [4, 'G90', 'N4 G90*20'],
    [101, 'M114', 'N101 M114*39'],
  ])('numbers line %i as the controller accepted it', (number, text, wire) => {
    expect(numberedLine(number, text)).toBe(wire);
  });
});
