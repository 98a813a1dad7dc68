// What is written under `analyzer.dialect` to the dialect itself, and what is wrong with it, with the place where.
import {
  problemOfScanTemplate,
  problemsOfScanTable,
  type ScanTableDialect,
  type ScanTemplateName,
  scanTemplateNames,
} from '../../drivers/analyzer/scan-table/scan-table-dialect.ts';
import { dialectNamed } from '../../drivers/analyzer/scpi-dialects.ts';
import {
  type Completion,
  problemOfTemplate,
  problemsOf,
  type ScpiDialect,
  type ScpiTemplate,
  type ScpiTemplates,
  type TemplateName,
  templateNames,
} from '../../drivers/analyzer/scpi-templates.ts';
import type { Finding } from './check-tree.ts';
import type { DialectText } from './dialect-schema.ts';
import { nearestWord } from './nearest-word.ts';

type Path = readonly (string | number)[];

const scpiOnly = ['channel', 'oneStartRuns'] as const;
const scanOnly = ['identity', 'prompt', 'sendsLineEnd', 'source', 'correctionOnSays', 'fixed'] as const;

/** The dialect as the driver takes it; only for what checkDialect has nothing against. */
export function dialectOf(written: DialectText): ScpiDialect | ScanTableDialect {
  return written.base === 'scan-table' ? scanTableOf(written) : scpiDialectOf(written);
}

/** `path` is that of the dialect in its file. */
export function checkDialect(written: DialectText, path: Path): Finding[] {
  const isScan = written.base === 'scan-table';
  const findings = foreignKeys(written, path, isScan ? scpiOnly : scanOnly);
  findings.push(...foreignTemplates(written, [...path, 'templates'], isScan));
  findings.push(...checkColumns(written, path));
  if (findings.length > 0) return findings;
  return isScan ? checkScanTable(written, path) : checkScpi(written, path);
}

function foreignKeys(written: DialectText, path: Path, keys: readonly (keyof DialectText)[]): Finding[] {
  return keys
    .filter((key) => written[key] !== undefined)
    .map((key) => ({ path: [...path, key], expectation: `no such key for the base ${written.base}` }));
}

function foreignTemplates(written: DialectText, path: Path, isScan: boolean): Finding[] {
  const known: readonly string[] = isScan ? scanTemplateNames : templateNames;
  return Object.entries(written.templates)
    .filter(([name, template]) => template !== undefined && !known.includes(name))
    .map(([name]) => {
      const near = nearestWord(name, known);
      const expectation = `another template: the base ${written.base} has no ${name}`;
      return { path: [...path, name], expectation, ...(near && { advice: `did you mean ${near}?` }) };
    });
}

function checkColumns({ columns }: DialectText, path: Path): Finding[] {
  if (!columns || (['re', 'im'] as const).every((each) => columns.includes(each))) {
    if (!columns || new Set(columns).size === columns.length) return [];
  }
  return [{ path: [...path, 'columns'], expectation: 're and im, with frequency or without, none twice' }];
}

function scanTableOf(written: DialectText): ScanTableDialect {
  const templates: Partial<Record<ScanTemplateName, readonly string[]>> = {};
  for (const [name, template] of Object.entries(written.templates)) {
    if (template !== undefined && template !== 'none') templates[name as ScanTemplateName] = template;
  }
  const { identity, prompt, sendsLineEnd = 'lf', correctionOnSays, fixed, columns, source } = written;
  const completion = written.completion ? completionOf(written.completion) : undefined;
  return {
    base: 'scan-table',
    templates,
    identity,
    prompt,
    sendsLineEnd,
    columns: columns ?? ['frequency', 're', 'im'],
    completion: completion?.by === 'operation-complete-bit' ? undefined : completion,
    fixed: { ifBandwidthHz: fixed?.ifBandwidth, powerDbm: fixed?.power },
    source: source ?? 'switched',
    correctionOnSays,
  };
}

function checkScanTable(written: DialectText, path: Path): Finding[] {
  const wrong = Object.entries(written.templates).flatMap(([name, template]): Finding[] => {
    if (template === undefined || template === 'none') return [];
    const problem = problemOfScanTemplate(name as ScanTemplateName, template);
    if (problem === undefined) return [];
    const expectation = `a template that can be sent: it ${problem}`;
    return [{ path: [...path, 'templates', name], expectation }];
  });
  const missing = problemsOfScanTable(scanTableOf(written)).map((problem) => ({
    path,
    expectation: problem,
  }));
  wrong.push(...checkCompletion(written, [...path, 'completion']));
  if (written.completion?.by === 'operation-complete-bit') {
    wrong.push({ path: [...path, 'completion', 'by'], expectation: 'poll or wait, for this base' });
  }
  return wrong.length > 0 ? wrong : missing;
}

function scpiDialectOf(written: DialectText): ScpiDialect {
  const base = dialectNamed(written.base);
  const templates: Partial<Record<string, ScpiTemplate>> = { ...base.templates };
  for (const [name, template] of Object.entries(written.templates)) {
    if (template === 'none') delete templates[name];
    else if (template !== undefined) templates[name] = template.length === 1 ? template[0]! : template;
  }
  return {
    ...base,
    templates: templates as ScpiTemplates,
    channel: written.channel ?? base.channel,
    oneStartRuns: written.oneStartRuns ?? base.oneStartRuns,
    completion: written.completion ? completionOf(written.completion) : base.completion,
    columns: written.columns ?? base.columns,
  };
}

function completionOf({
  by,
  query = '',
  until = '',
  factor = 1.2,
}: NonNullable<DialectText['completion']>): Completion {
  if (by === 'poll') return { by, query, until };
  return by === 'wait' ? { by, factor } : { by };
}

function checkScpi(written: DialectText, path: Path): Finding[] {
  const findings: Finding[] = [];
  for (const [name, template] of Object.entries(written.templates)) {
    if (template === undefined || template === 'none') continue;
    const problem = problemOfTemplate(name as TemplateName, template);
    if (problem === undefined) continue;
    const expectation = `a template that can be sent: it ${problem}`;
    findings.push({ path: [...path, 'templates', name], expectation });
  }
  findings.push(...checkCompletion(written, [...path, 'completion']));
  if (findings.length > 0) return findings;
  return problemsOf(scpiDialectOf(written)).map((problem) => ({
    path: [...path, 'templates'],
    expectation: `every template without which nothing can be measured: ${problem}`,
  }));
}

function checkCompletion({ base, completion }: DialectText, path: Path): Finding[] {
  if (!completion) return [];
  const { by, query, until, factor } = completion;
  if (by === 'poll' && (query === undefined || until === undefined)) {
    return [{ path, expectation: 'query and until beside by: poll' }];
  }
  if (by !== 'poll' && (query !== undefined || until !== undefined)) {
    return [{ path, expectation: 'query and until beside by: poll only' }];
  }
  if (base !== 'scan-table' && query !== undefined && !query.includes('?')) {
    return [{ path: [...path, 'query'], expectation: 'a query, with a question mark' }];
  }
  if (by !== 'wait' && factor !== undefined) return [{ path, expectation: 'factor beside by: wait only' }];
  return [];
}
