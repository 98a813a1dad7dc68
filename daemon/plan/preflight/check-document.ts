// The document `check/1`: what other programs may rely on. The schema here is the documentation; the JSON Schema
// in the repository is generated from it, and a gate compares the two.
import { z } from 'zod';
import { subjects } from './finding.ts';

const check = z.strictObject({
  subject: z.enum(subjects).describe('What was looked at.'),
  verdict: z
    .enum(['go', 'caution', 'no-go', 'not-checked'])
    .describe('caution: it can go, with something to know; not-checked: an input is missing, named in text.'),
  text: z.string().describe('What was found and against which demand, for people.'),
  change: z.string().optional().describe('What to change, where there is something.'),
  facts: z.record(z.string(), z.number()).readonly().describe('Numbers by names that end in their unit.'),
});

export const checkDocument = z
  .strictObject({
    nightcut: z.literal('check/1'),
    verdict: z.enum(['go', 'no-go']).describe('no-go when one check says so.'),
    antenna: z.strictObject({ name: z.string(), revision: z.string() }),
    range: z.string(),
    checkedWallMs: z.number().describe('Milliseconds since 1970-01-01 UTC.'),
    predicted: z
      .strictObject({
        samples: z.int().nonnegative().describe('With ties and closures.'),
        durationMs: z.number().describe('Without homing, retries and holds.'),
        endWallMs: z.number().describe('When it would end if it began now.'),
        archiveBytes: z.number(),
      })
      .optional()
      .describe('Absent where the plan does not fit the travel of the axes.'),
    checks: z.array(check),
  })
  .describe('Whether a plan can work on a range, checked before anything moves or transmits.');

export type CheckDocument = z.infer<typeof checkDocument>;

/** The JSON Schema of the document, as daemon/plan/preflight/schema/check.schema.json holds it. */
export function checkSchemaText(): string {
  return `${JSON.stringify(z.toJSONSchema(checkDocument), undefined, 2)}\n`;
}
