import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { parseRangeFile } from '../../../../daemon/files/parse-range-file.ts';
import { dialectNamed } from '../../../../drivers/analyzer/scpi-dialects.ts';
import { refusalOf } from './refusal.ts';
import { rangeLines, whole } from './written-files.ts';

/** The range file with these lines in the place of `dialect: …`, line 8. */
function withDialect(...lines: string[]): string {
  return whole([...rangeLines.slice(0, 7), ...lines, ...rangeLines.slice(8)]);
}

const parse = (...lines: string[]) => parseRangeFile(withDialect(...lines), 'range.yaml').analyzer.dialect;

const scanTable = [
  '  dialect:',
  '    base: scan-table',
  '    prompt: "ok>"',
  '    source: only-while-scanning',
  '    fixed: { power: -7 dBm }',
  '    templates:',
  '      identityQuery: version',
  '      ifBandwidth: bandwidth {value}',
  '      scanS21: scan {start} {stop} {points} 5',
];

describe('a dialect in a range file', () => {
  it('is a built-in one by its name', () => {
    for (const name of ['numbered-parameter', 'named-measurement', 'selected-trace']) {
      expect(parse(`  dialect: ${name}`)).toEqual(dialectNamed(name));
    }
  });

  it('is a built-in one with templates of its own', () => {
    const base = dialectNamed('named-measurement');
    const { averagingByPoint: _, ...others } = base.templates;
    expect(
      parse(
        '  dialect:',
        '    base: named-measurement',
        '    channel: 3',
        '    oneStartRuns: whole-average',
        '    completion: { by: poll, query: ":STAT:OPER:COND?", until: "0" }',
        '    columns: [frequency, re, im]',
        '    templates:',
        '      startSweep: ":INIT{channel}:IMM:ALL"',
        '      output: ":OUTP {oneZero}"',
        '      averagingByPoint: none',
        '      parameterClear: [":CALC:MEAS:CLE", ":DISP:CLE"]',
      ),
    ).toEqual({
      ...base,
      channel: 3,
      oneStartRuns: 'whole-average',
      completion: { by: 'poll', query: ':STAT:OPER:COND?', until: '0' },
      columns: ['frequency', 're', 'im'],
      templates: {
        ...others,
        startSweep: ':INIT{channel}:IMM:ALL',
        output: ':OUTP {oneZero}',
        parameterClear: [':CALC:MEAS:CLE', ':DISP:CLE'],
      },
    });
  });

  it('waits for a sweep by its stated time', () => {
    const lines = ['  dialect:', '    base: selected-trace', '    completion: { by: wait, factor: 1.5 }'];
    expect(parse(...lines)).toMatchObject({ completion: { by: 'wait', factor: 1.5 } });
  });

  it('describes an instrument with command words of its own', () => {
    expect(parse(...scanTable)).toMatchObject({
      base: 'scan-table',
      prompt: 'ok>',
      sendsLineEnd: 'lf',
      columns: ['frequency', 're', 'im'],
      fixed: { powerDbm: -7 },
      templates: { scanS21: ['scan {start} {stop} {points} 5'] },
    });
  });

  it('may be written as the README writes it', () => {
    const blocks = readFileSync('README.md', 'utf8').matchAll(/```yaml\n( {2}dialect:\n[^`]+)```/g);
    const examples = Array.from(blocks, ([, block = '']) => parse(...block.trimEnd().split('\n')));
    expect(examples).toMatchObject([{ name: 'named-measurement' }, { base: 'scan-table' }]);
  });

  const templates = (line: string): string[] => [
    '  dialect:',
    '    base: numbered-parameter',
    '    templates:',
    '      abort: ":ABOR"',
    line,
  ];

  it.each<[string[], number, string]>([
    [['  dialect: named-measurment'], 8, 'analyzer.dialect: expected one of numbered-parameter'],
    [['  dialect: [named-measurement]'], 8, 'analyzer.dialect: expected one of '],
    [['  dialect: { base: hand-made }'], 8, 'analyzer.dialect.base: expected one of '],
    [['  dialect: { templates: {} }'], 8, 'analyzer.dialect.base: expected one of '],
    [templates('      startSwep: ":INIT"'), 12, 'unknown key `startSwep`; did you mean `startSweep`?'],
    [templates('      startSweep: ":INIT;:OUTP ON"'), 12, 'write several as a list'],
    [templates('      startSweep: ":INIT\\n:OUTP ON"'), 12, 'no control characters'],
    [templates('      startSweep: ":INIT\\x07"'), 12, 'no control characters'],
    [templates('      startSweep: [":INIT", ":OUTP ON;:X"]'), 12, 'write several as a list'],
    [templates('      startSweep: ""'), 12, 'startSweep: expected one line of printable ASCII'],
    [templates('      startSweep: { a: b }'), 12, 'startSweep: expected one line of printable ASCII'],
    [templates('      startSweep: ":INIT?"'), 12, 'it must ask nothing'],
    [templates('      pointsQuery: ":SWE:POIN"'), 12, 'it must be one query'],
    [templates('      points: ":SWE:POIN 201"'), 12, 'it must contain {value}'],
    [templates('      points: ":SWE:POIN {pints}"'), 12, 'nothing fills {pints}'],
    [templates('      output: ":OUTP ON"'), 12, 'it must contain {onOff} or {oneZero}'],
    [templates('      startSweep: none'), 10, "'startSweep' is missing"],
    [templates('      scanS21: "scan {start} {stop} {points}"'), 12, 'has no scanS21'],
    [[...templates('      points: ":P {value}"'), '    prompt: ok'], 13, 'no such key for the base numbered'],
    [[...templates('      points: ":P {value}"'), '    chanel: 2'], 13, 'did you mean `channel`?'],
    [[...templates('      points: ":P {value}"'), '    completion: { by: poll }'], 13, 'query and until'],
    [
      [...templates('      points: ":P {value}"'), '    completion: { by: poll, query: ":A", until: "1" }'],
      13,
      'completion.query: expected a query, with a question mark',
    ],
    [
      [...templates('      points: ":P {value}"'), '    completion: { by: wait, factor: 0.5 }'],
      13,
      'expected a number from 1 to 20; found 0.5',
    ],
    [[...templates('      points: ":P {value}"'), '    columns: [frequency, re]'], 13, 're and im'],
    [[...templates('      points: ":P {value}"'), '    columns: [re, im, im]'], 13, 'none twice'],
    [['  dialect: scan-table'], 8, 'at least one scan'],
    [scanTable.filter((line) => !line.includes('identityQuery')), 8, 'identityQuery: any question'],
    [scanTable.filter((line) => !line.includes('fixed')), 8, 'the template power, or'],
    [scanTable.filter((line) => !line.includes('source')), 8, 'the template output, or source'],
    [
      scanTable.map((line) => line.replace(' {points}', '')),
      16,
      'it must contain {start}, {stop} and {points}',
    ],
    [[...scanTable, '      power: ["p {value}", "b"]'], 17, 'it must be one line'],
    [[...scanTable, '    columns: [re, im]'], 8, 'columns with frequency, or the template frequencyQuery'],
    [[...scanTable, '    completion: { by: wait }'], 8, 'scans of several lines'],
    [[...scanTable, '    completion: { by: operation-complete-bit }'], 17, 'poll or wait, for this base'],
    [[...scanTable, '    completion: { by: poll, query: "a?" }'], 17, 'query and until beside by: poll'],
    [[...scanTable, '      startSweep: ":INIT"'], 17, 'the base scan-table has no startSweep'],
    [[...scanTable, '    channel: 2'], 17, 'no such key for the base scan-table'],
  ])('is refused: %j', (lines, line, words) => {
    const { code, facts } = refusalOf(() => parse(...lines));
    expect(code).toBe('FILE_INVALID');
    expect(facts['problems']).toContain(words);
    expect(facts['line']).toBe(line);
  });
});
