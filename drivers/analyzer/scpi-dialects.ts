// The built-in dialects by name, and what a dialect learns of its instrument.
import { DriverError } from '../errors.ts';
import { namedMeasurement } from './dialects/named-measurement.ts';
import { numberedParameter } from './dialects/numbered-parameter.ts';
import { selectedTrace } from './dialects/selected-trace.ts';
import { fillTemplate, type ScpiDialect, type ScpiTemplates } from './scpi-templates.ts';

const builtIn: readonly ScpiDialect[] = [numberedParameter, namedMeasurement, selectedTrace];

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
    return fillTemplate(template, { channel: dialect.channel, trace: 1 })[0] === message;
  });
  if (name === undefined) return undefined;
  const { [name]: _, ...templates } = dialect.templates;
  return { ...dialect, templates: templates as ScpiTemplates };
}
