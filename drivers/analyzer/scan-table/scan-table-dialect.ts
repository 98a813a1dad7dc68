// Analyzers with command words of their own that answer one line ("scan from here to there") with a table of
// numbers: what such an instrument is told and how it answers, as data. There is no built-in one; a range file
// describes it. A scan may be several lines: the last is the one that is answered with the table. Placeholders of a scan: {start} {stop} in Hz, {points}, {ifBandwidth} in Hz, {power} in dBm; of a
// setting: {value}; of the output: {onOff} or {oneZero}.
import { DriverError } from '../../errors.ts';
import type { SParameter } from '../analyzer.ts';
import { type Completion, fillTemplate, type Substitutions, type TraceColumn } from '../scpi-templates.ts';

export const scanTemplateNames = [
  'identityQuery',
  'scanS11',
  'scanS21',
  'scanS12',
  'scanS22',
  'ifBandwidth',
  'ifBandwidthQuery',
  'power',
  'powerQuery',
  'output',
  'outputQuery',
  'correctionQuery',
  'frequencyQuery',
  'abort',
] as const;
export type ScanTemplateName = (typeof scanTemplateNames)[number];

export interface ScanTableDialect {
  readonly base: 'scan-table';
  readonly templates: Readonly<Partial<Record<ScanTemplateName, readonly string[]>>>;
  /** What people call the instrument; what it answers to identityQuery stands beside it. */
  readonly identity?: string | undefined;
  /** What it prints when it is ready for the next line; without one, answers are counted in lines. */
  readonly prompt?: string | undefined;
  readonly sendsLineEnd: 'lf' | 'cr' | 'crlf';
  /** Of each line of the table. With the frequency in it every point is proven to be the one asked for. */
  readonly columns: readonly TraceColumn[];
  /** What is done between the lines before the last one of a scan and the last; without it, nothing. */
  readonly completion?: Exclude<Completion, { by: 'operation-complete-bit' }> | undefined;
  /** Settings that the instrument has once and for all; a plan must ask for just these. */
  readonly fixed: { readonly ifBandwidthHz?: number | undefined; readonly powerDbm?: number | undefined };
  /** `switched`: by `output`; `only-while-scanning`: there is nothing to switch off between two scans. */
  readonly source: 'switched' | 'only-while-scanning';
  /** Words that the answer to correctionQuery holds when the correction is on. */
  readonly correctionOnSays?: string | undefined;
}

export function scanTemplateOf(parameter: SParameter): ScanTemplateName {
  return `scan${parameter}`;
}

const scanValues = { start: 1e9, stop: 2e9, points: 11, ifBandwidth: 1000, power: 0 };

function sampleOf(name: ScanTemplateName): Substitutions {
  if (name.startsWith('scan')) return scanValues;
  if (name === 'ifBandwidth' || name === 'power') return { value: 1 };
  return name === 'output' ? { onOff: 'ON' } : {};
}

/** What is wrong with one template, after its name; undefined when it can be used. */
export function problemOfScanTemplate(
  name: ScanTemplateName,
  template: readonly string[],
): string | undefined {
  try {
    fillTemplate(template, sampleOf(name));
  } catch (error) {
    if (error instanceof DriverError) return `cannot be sent: ${error.message}`;
    throw error;
  }
  const has = (word: string): boolean => template.some((line) => line.includes(`{${word}}`));
  if (template.length !== 1 && !name.startsWith('scan')) return 'must be one line';
  if (name.startsWith('scan') && !(has('start') && has('stop') && has('points'))) {
    return 'must contain {start}, {stop} and {points}';
  }
  if ((name === 'ifBandwidth' || name === 'power') && !has('value')) return 'must contain {value}';
  if (name === 'output' && !has('onOff') && !has('oneZero')) return 'must contain {onOff} or {oneZero}';
  return undefined;
}

/** What is missing in the dialect as a whole, in sentences; empty when an instrument can be driven by it. */
export function problemsOfScanTable(dialect: ScanTableDialect): string[] {
  const { templates, fixed, columns } = dialect;
  const problems: string[] = [];
  const scans = [templates.scanS11, templates.scanS21, templates.scanS12, templates.scanS22];
  if (scans.every((scan) => scan === undefined)) problems.push('at least one scan, such as scanS21');
  if (templates.identityQuery === undefined) {
    problems.push('identityQuery: any question whose answer never changes, to find back into step');
  }
  const isTold = (name: 'ifBandwidth' | 'power'): boolean =>
    templates[name] !== undefined ||
    scans.every((scan) => scan === undefined || scan.some((line) => line.includes(`{${name}}`)));
  if (fixed.ifBandwidthHz === undefined && !isTold('ifBandwidth')) {
    problems.push('the template ifBandwidth, or the bandwidth that the instrument has under fixed');
  }
  if (fixed.powerDbm === undefined && !isTold('power')) {
    problems.push('the template power, or the power that the instrument has under fixed');
  }
  if (dialect.source === 'switched' && templates.output === undefined) {
    problems.push('the template output, or source: only-while-scanning');
  }
  if (!columns.includes('frequency') && templates.frequencyQuery === undefined) {
    problems.push('columns with frequency, or the template frequencyQuery: else no grid is proven');
  }
  if (dialect.completion && scans.some((scan) => scan?.length === 1)) {
    problems.push('scans of several lines, for completion is waited for before the last one');
  }
  if (!columns.includes('re') || !columns.includes('im')) problems.push('columns with re and im');
  return problems;
}
