// Command shapes of analyzers as data. A dialect is a table of templates, named by how S-parameters are
// chosen; everything else in this folder is common to all. A template is one message without line end
// (or a list of messages, for commands that take several); a query has a question mark.
//
// Placeholders: {channel} the channel's number · {value} a number · {onOff} ON or OFF, {oneZero} 1 or 0 ·
// {count} a number of parameters · {trace} number of a trace, from 1 · {parameter} S11, S21, S12 or S22.
import { DriverError } from '../errors.ts';

export type ScpiTemplate = string | readonly string[];

/** Commands and queries without which nothing can be measured. */
const requiredTemplates = [
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
  'dataQuery',
  'errorQuery',
] as const;

/** What an instrument may do without: fixed, computed, or simply not asked. */
const optionalTemplates = [
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
  'parameterClear',
  'parameterCount',
  'parameterCountQuery',
  'parameterDefineQuery',
  'parameterListQuery',
  'parameterSelect',
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

type RequiredTemplate = (typeof requiredTemplates)[number];
type OptionalTemplate = (typeof optionalTemplates)[number];
export type TemplateName = RequiredTemplate | OptionalTemplate;

export const templateNames: readonly TemplateName[] = [...requiredTemplates, ...optionalTemplates];

export type ScpiTemplates = Readonly<
  Record<RequiredTemplate, ScpiTemplate> & Partial<Record<OptionalTemplate, ScpiTemplate>>
>;

/**
 * How the end of a sweep is known. `operation-complete-bit`: *OPC, then *ESR? until its bit 0; `poll`: a query
 * until it answers the word or number `until`; `wait`: the stated time of the sweep times `factor`, and some more.
 */
export type Completion =
  | { readonly by: 'operation-complete-bit' }
  | { readonly by: 'poll'; readonly query: string; readonly until: string }
  | { readonly by: 'wait'; readonly factor: number };

/** What the instrument sends for each point of a trace, in this order. */
export type TraceColumn = 'frequency' | 're' | 'im';

export interface ScpiDialect {
  readonly name: string;
  readonly templates: ScpiTemplates;
  readonly channel: number;
  /**
   * What one start runs while whole sweeps are averaged. `one-sweep`: N starts make an average of N;
   * `whole-average`: the instrument sweeps N times by itself. Without meaning where it averages by point.
   */
  readonly oneStartRuns: 'one-sweep' | 'whole-average';
  readonly completion: Completion;
  readonly columns: readonly TraceColumn[];
  /**
   * Optional commands that an instrument may refuse as unknown (−113) without harm, and optional queries that
   * are left out once it has: what they would have confirmed is then proven otherwise, or taken as sent.
   */
  readonly mayBeUnknown: readonly TemplateName[];
}

export type Substitutions = Readonly<Record<string, string | number>>;

/**
 * A template with its placeholders filled: the messages to send, each without line end.
 * Throws ANALYZER_BAD_DIALECT when a placeholder has no value, or when the result would be more than one
 * message: control characters, quotes and `;` are refused in whatever is filled in.
 */
export function fillTemplate(template: ScpiTemplate, substitutions: Substitutions): string[] {
  const templates = typeof template === 'string' ? [template] : template;
  const { onOff } = substitutions;
  const values = onOff === undefined ? substitutions : { ...substitutions, oneZero: onOff === 'ON' ? 1 : 0 };
  return templates.map((one) => {
    const message = one.replace(/\{(\w*)\}/g, (_, name: string) => substitute(one, name, values));
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

/** What is wrong with a dialect, in sentences; empty when it can be used. For constructors. */
export function problemsOf(dialect: ScpiDialect): string[] {
  const templates: Readonly<Record<string, ScpiTemplate | undefined>> = dialect.templates;
  const known = new Set<string>(templateNames);
  const problems = requiredTemplates
    .filter((name) => templates[name] === undefined)
    .map((name) => `'${name}' is missing`);
  for (const [name, template] of Object.entries(templates)) {
    if (!known.has(name)) problems.push(`'${name}' is no template`);
    else if (template !== undefined) {
      const problem = problemOfTemplate(name as TemplateName, template);
      if (problem !== undefined) problems.push(`'${name}' ${problem}`);
    }
  }
  return problems;
}

/** One value for every placeholder that the template of this name may have. */
function sampleValues(name: TemplateName): Substitutions {
  if (name === 'output' || name === 'averagingState') return { channel: 1, onOff: 'ON' };
  if (name === 'parameterCount') return { channel: 1, count: 1 };
  if (name === 'frequencyAxisQuery' || name === 'parameterDefineQuery') return { channel: 1, trace: 1 };
  if (name === 'dataQuery' || name === 'parameterDefine' || name === 'parameterSelect') {
    return { channel: 1, trace: 1, parameter: 'S21' };
  }
  return valueTemplates.has(name) ? { channel: 1, value: 1 } : { channel: 1 };
}

const valueTemplates: ReadonlySet<TemplateName> = new Set([
  'startFrequency',
  'stopFrequency',
  'points',
  'ifBandwidth',
  'power',
  'averagingCount',
]);

/** What is wrong with one template, after its name; undefined when it can be used. */
export function problemOfTemplate(name: TemplateName, template: ScpiTemplate): string | undefined {
  const values = sampleValues(name);
  try {
    const messages = fillTemplate(template, values);
    const asks = messages.filter((message) => message.includes('?')).length;
    if (name.endsWith('Query') ? asks !== 1 || messages.length !== 1 : asks > 0 || messages.length === 0) {
      return `must ${name.endsWith('Query') ? 'be one query' : 'ask nothing'}`;
    }
  } catch (error) {
    if (error instanceof DriverError) return `cannot be sent: ${error.message}`;
    throw error;
  }
  const needed = neededPlaceholders(values);
  const text = typeof template === 'string' ? template : template.join(' ');
  const isFilled = needed.length === 0 || needed.some((each) => text.includes(`{${each}}`));
  return isFilled || name === 'frequencyAxisQuery' || name === 'dataQuery'
    ? undefined
    : `must contain {${needed.join('} or {')}}`;
}

/** A setting that does not say its value sets nothing. */
function neededPlaceholders(values: Substitutions): string[] {
  if (values['onOff'] !== undefined) return ['onOff', 'oneZero'];
  return Object.keys(values).filter((each) => each !== 'channel');
}
