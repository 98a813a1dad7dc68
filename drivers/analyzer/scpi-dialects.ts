// Command shapes of analyzers as data. A dialect is a table of templates, named by how S-parameters are
// chosen; everything else in this folder is common to all. A template is one message without line end
// (or a list of messages, for commands that take several); a query ends in a question mark.
//
// Placeholders: {channel} the channel's number · {value} a number · {onOff} ON or OFF · {count} a number
// of parameters · {trace} number of a trace, from 1 · {parameter} S11, S21, S12 or S22.
import { DriverError } from '../errors.ts';

export type ScpiTemplate = string | readonly string[];

/** Commands and queries without which nothing can be measured. */
export const requiredTemplates = [
  'startFrequency',
  'startFrequencyQuery',
  'stopFrequency',
  'stopFrequencyQuery',
  'points',
  'pointsQuery',
  'ifBandwidth',
  'ifBandwidthQuery',
  'power',
  'powerQuery',
  'output',
  'outputQuery',
  'continuousOff',
  'startSweep',
  'abort',
  'parameterDefine',
  'parameterSelect',
  'dataQuery',
  'errorQuery',
] as const;

/** What an instrument may do without: fixed, computed, or simply not asked. */
export const optionalTemplates = [
  'averagingState',
  'averagingStateQuery',
  'averagingCount',
  'averagingCountQuery',
  'averagingClear',
  'averagingByPoint',
  'averagingModeQuery',
  'sweepTypeLinear',
  'sweepTypeQuery',
  'continuousQuery',
  'triggerImmediate',
  'parameterCount',
  'parameterCountQuery',
  'parameterDefineQuery',
  'frequencyAxisQuery',
  'sweepTimeQuery',
  'formatReal64',
  'formatReal32',
  'formatAscii',
  'formatQuery',
  'byteOrderNormal',
  'byteOrderSwapped',
  'byteOrderQuery',
  'correctionQuery',
  'correctionInterpolatedQuery',
  'correctionDateQuery',
] as const;

export type RequiredTemplate = (typeof requiredTemplates)[number];
export type OptionalTemplate = (typeof optionalTemplates)[number];
export type TemplateName = RequiredTemplate | OptionalTemplate;

export type ScpiTemplates = Readonly<
  Record<RequiredTemplate, ScpiTemplate> & Partial<Record<OptionalTemplate, ScpiTemplate>>
>;

export interface ScpiDialect {
  readonly name: string;
  readonly templates: ScpiTemplates;
  readonly channel: number;
  /**
   * What one start runs while whole sweeps are averaged. `one-sweep`: N starts make an average of N;
   * `whole-average`: the instrument sweeps N times by itself. Without meaning where it averages by point.
   */
  readonly oneStartRuns: 'one-sweep' | 'whole-average';
  /**
   * Optional commands that an instrument may refuse as unknown (−113) without harm, and optional queries that
   * are left out once it has: what they would have confirmed is then proven otherwise, or taken as sent.
   */
  readonly mayBeUnknown: readonly TemplateName[];
}

/**
 * S-parameters by number of a trace: their count is set, each is defined, and data are read of the
 * selected one. Averaging is asked for by point, for then one start means one thing everywhere; where the
 * instrument averages whole sweeps only, one start is taken to run one of them: were it the whole average,
 * N starts would only cost time, whereas one too few would pass an unfinished average off as a finished one.
 */
const numberedParameter: ScpiDialect = {
  name: 'numbered-parameter',
  channel: 1,
  oneStartRuns: 'one-sweep',
  mayBeUnknown: [
    'triggerImmediate',
    'sweepTypeLinear',
    'averagingByPoint',
    'averagingModeQuery',
    'sweepTimeQuery',
    'frequencyAxisQuery',
    'continuousQuery',
    'byteOrderQuery',
    'correctionQuery',
  ],
  templates: {
    startFrequency: ':SENS{channel}:FREQ:STAR {value}',
    startFrequencyQuery: ':SENS{channel}:FREQ:STAR?',
    stopFrequency: ':SENS{channel}:FREQ:STOP {value}',
    stopFrequencyQuery: ':SENS{channel}:FREQ:STOP?',
    points: ':SENS{channel}:SWE:POIN {value}',
    pointsQuery: ':SENS{channel}:SWE:POIN?',
    ifBandwidth: ':SENS{channel}:BAND {value}',
    ifBandwidthQuery: ':SENS{channel}:BAND?',
    power: ':SOUR{channel}:POW {value}',
    powerQuery: ':SOUR{channel}:POW?',
    output: ':OUTP {onOff}',
    outputQuery: ':OUTP?',
    continuousOff: ':INIT{channel}:CONT OFF',
    continuousQuery: ':INIT{channel}:CONT?',
    startSweep: ':INIT{channel}',
    abort: ':ABOR',
    averagingState: ':SENS{channel}:AVER {onOff}',
    averagingStateQuery: ':SENS{channel}:AVER?',
    averagingCount: ':SENS{channel}:AVER:COUN {value}',
    averagingCountQuery: ':SENS{channel}:AVER:COUN?',
    averagingClear: ':SENS{channel}:AVER:CLE',
    averagingByPoint: ':SENS{channel}:AVER:MODE POIN',
    averagingModeQuery: ':SENS{channel}:AVER:MODE?',
    sweepTypeLinear: ':SENS{channel}:SWE:TYPE LIN',
    triggerImmediate: ':TRIG:SOUR IMM',
    sweepTimeQuery: ':SENS{channel}:SWE:TIME?',
    parameterCount: ':CALC{channel}:PAR:COUN {count}',
    parameterCountQuery: ':CALC{channel}:PAR:COUN?',
    parameterDefine: ':CALC{channel}:PAR{trace}:DEF {parameter}',
    parameterDefineQuery: ':CALC{channel}:PAR{trace}:DEF?',
    parameterSelect: ':CALC{channel}:PAR{trace}:SEL',
    dataQuery: ':CALC{channel}:DATA? SDATA',
    frequencyAxisQuery: ':CALC{channel}:X?',
    formatReal64: ':FORM REAL,64',
    formatReal32: ':FORM REAL,32',
    formatAscii: ':FORM ASC',
    formatQuery: ':FORM?',
    byteOrderNormal: ':FORM:BORD NORM',
    byteOrderSwapped: ':FORM:BORD SWAP',
    byteOrderQuery: ':FORM:BORD?',
    correctionQuery: ':SENS{channel}:CORR?',
    errorQuery: ':SYST:ERR?',
  },
};

const builtIn: readonly ScpiDialect[] = [numberedParameter];

/** The built-in dialects' names, for checks of files and for help. */
export const dialectNames: readonly string[] = builtIn.map(({ name }) => name);

/** A built-in dialect. Throws ANALYZER_BAD_DIALECT for a name that is none. */
export function dialectNamed(name: string): ScpiDialect {
  const dialect = builtIn.find((one) => one.name === name);
  if (dialect) return dialect;
  throw new DriverError(
    'ANALYZER_BAD_DIALECT',
    `there is no dialect '${name}'; there is ${dialectNames.join(', ')}`,
    { dialect: name },
  );
}

/** The same dialect without the optional query that reads `message`; undefined where it has to be known. */
export function withoutQuery(dialect: ScpiDialect, message: string): ScpiDialect | undefined {
  const name = dialect.mayBeUnknown.find((each) => {
    const template = dialect.templates[each];
    if (!each.endsWith('Query') || template === undefined) return false;
    return fillTemplate(template, { channel: dialect.channel })[0] === message;
  });
  if (name === undefined) return undefined;
  const { [name]: _, ...templates } = dialect.templates;
  return { ...dialect, templates: templates as ScpiTemplates };
}

export type Substitutions = Readonly<Record<string, string | number>>;

/**
 * A template with its placeholders filled: the messages to send, each without line end.
 * Throws ANALYZER_BAD_DIALECT when a placeholder has no value, or when the result would be more than one
 * message: control characters, quotes and `;` are refused in whatever is filled in.
 */
export function fillTemplate(template: ScpiTemplate, substitutions: Substitutions): string[] {
  const templates = typeof template === 'string' ? [template] : template;
  return templates.map((one) => {
    const message = one.replace(/\{(\w*)\}/g, (_, name: string) => substitute(one, name, substitutions));
    checkMessage(message);
    return message;
  });
}

function substitute(template: string, name: string, substitutions: Substitutions): string {
  const value = Object.hasOwn(substitutions, name) ? substitutions[name] : undefined;
  if (value === undefined) {
    throw new DriverError('ANALYZER_BAD_DIALECT', `nothing fills {${name}} in '${template}'`, {
      template,
      placeholder: name,
    });
  }
  const text = String(value);
  const unsafe =
    typeof value === 'number' ? !Number.isFinite(value) : !/^[^\x00-\x1f\x7f-\uffff"'`;]+$/.test(text);
  if (!unsafe) return text;
  throw new DriverError('ANALYZER_BAD_DIALECT', `what should fill {${name}} in '${template}' is refused`, {
    template,
    placeholder: name,
  });
}

/** One message, one question: nothing that would end the message or begin a second one. */
export function checkMessage(message: string): void {
  if (message !== '' && /^[\x20-\x7e]+$/.test(message) && !message.includes(';')) return;
  throw new DriverError(
    'ANALYZER_BAD_DIALECT',
    'a message is one line of printable ASCII with one command or one query',
    { message: JSON.stringify(message).slice(0, 100) },
  );
}

/** What is wrong with a dialect, in sentences; empty when it can be used. For files and constructors. */
export function problemsOf(dialect: ScpiDialect): string[] {
  const templates: Readonly<Record<string, ScpiTemplate | undefined>> = dialect.templates;
  const known = new Set<string>([...requiredTemplates, ...optionalTemplates]);
  const problems = requiredTemplates
    .filter((name) => templates[name] === undefined)
    .map((name) => `'${name}' is missing`);
  for (const [name, template] of Object.entries(templates)) {
    if (!known.has(name)) problems.push(`'${name}' is no template`);
    else if (template !== undefined) problems.push(...problemsOfTemplate(name, template));
  }
  return problems;
}

const sampleValues: Substitutions = {
  channel: 1,
  value: 1,
  onOff: 'ON',
  count: 1,
  trace: 1,
  parameter: 'S21',
};

function problemsOfTemplate(name: string, template: ScpiTemplate): string[] {
  try {
    const messages = fillTemplate(template, sampleValues);
    const asks = messages.filter((message) => message.includes('?')).length;
    if (name.endsWith('Query') ? asks === 1 && messages.length === 1 : asks === 0) return [];
    return [`'${name}' must ${name.endsWith('Query') ? 'be one query' : 'ask nothing'}`];
  } catch (error) {
    if (error instanceof DriverError) return [`'${name}': ${error.message}`];
    throw error;
  }
}
