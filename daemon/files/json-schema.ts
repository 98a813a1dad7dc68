// The JSON Schemas of both written files, for editors that underline slips while one types. They hold the
// shape alone; checks between fields need the loaders. Kept in schema/ and compared by a gate test.
import { z } from 'zod';
import { builtInNames, dialectSchema } from './dialect-schema.ts';
import { planSchema } from './plan-schema.ts';
import { rangeSchema } from './range-schema.ts';

/** Text of each schema file by its name in daemon/files/schema/. */
export function schemaFiles(): Record<string, string> {
  return {
    'range.schema.json': schemaText(rangeSchema),
    'plan.schema.json': schemaText(planSchema),
  };
}

function schemaText(schema: z.ZodType): string {
  const json = z.toJSONSchema(schema, {
    io: 'input',
    // The loaders read text, an editor reads numbers: its defaults are numbers too.
    override: ({ zodSchema, jsonSchema }) => {
      if (zodSchema === dialectSchema) allowName(jsonSchema);
      if (jsonSchema.type === 'integer' && jsonSchema.default !== undefined) {
        jsonSchema.default = Number(jsonSchema.default);
      }
    },
  });
  return `${JSON.stringify(json, undefined, 2)}\n`;
}

/** A dialect is a mapping, or a name alone: the loader makes a mapping of it before its schema is asked. */
function allowName(jsonSchema: z.core.JSONSchema.BaseSchema): void {
  const mapping = { ...jsonSchema };
  for (const key of Object.keys(jsonSchema)) delete jsonSchema[key];
  jsonSchema.anyOf = [{ enum: [...builtInNames] }, mapping];
}
