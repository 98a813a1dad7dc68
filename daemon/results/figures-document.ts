// The document `figures/1`: what other programs may rely on. The schema here is the documentation; the
// JSON Schema in the repository is generated from it, and a gate compares the two.
import { z } from 'zod';
import { cutFigureKeys as patternFigureKeys } from '../pattern/figures.ts';

/** One figure at one frequency: a value, a bound, or the reason why there is none. */
export const figureEntry = z
  .union([
    z
      .strictObject({
        value: z.number(),
        U: z.number().optional().describe('Half width of the 95 % interval, where it is known.'),
        Uminus: z.number().optional(),
        Uplus: z.number().optional(),
        bound: z
          .enum(['upper', 'lower'])
          .optional()
          .describe('Present where only a bound is known; value is then that bound.'),
        note: z
          .string()
          .optional()
          .describe('What to know before trusting it, such as a level near the floor.'),
      })
      .describe('A figure with its value.'),
    z.strictObject({ absent: z.string() }).describe('No figure, and why.'),
  ])
  .describe('One figure at one frequency.');

export type FigureEntry = z.infer<typeof figureEntry>;

const perFrequency = z.array(figureEntry).describe('One entry per frequency, in the order of frequenciesHz.');

/** Those of the pattern itself, and those that need more than the pattern. */
export const cutFigureKeys = [
  ...patternFigureKeys,
  'realizedGainDbi',
  'gainDbi',
  'closureDb',
  'driftDb',
] as const;

export type CutFigureKey = (typeof cutFigureKeys)[number];

const cut = z.strictObject({
  name: z.string(),
  axis: z.string().describe('The swept axis.'),
  plane: z.enum(['E', 'H', 'other']),
  at: z.record(z.string(), z.number()).describe('Pattern angles of the other axes, degrees.'),
  autRollDeg: z.number(),
  component: z.enum(['co', 'cross']),
  gated: z.boolean(),
  anglesDeg: z.array(z.number()).describe('Pattern angles of the samples, ascending, degrees.'),
  levelDb: z
    .array(z.array(z.number()))
    .optional()
    .describe('Levels 20 log|S21| corrected for drift: one row per frequency, one value per angle.'),
  figures: z.partialRecord(z.enum(cutFigureKeys), perFrequency),
});

const flag = z.strictObject({
  code: z.string().describe('Permanent name of the finding, such as CLOSURE_LARGE.'),
  text: z.string().describe('The finding in words.'),
  cut: z.string().optional(),
});

export const figuresDocument = z
  .strictObject({
    nightcut: z.literal('figures/1'),
    run: z.int().positive(),
    uuid: z.string(),
    kind: z.enum(['pattern', 'reference', 'floor', 'trim', 'import']),
    state: z.enum(['running', 'complete', 'interrupted', 'failed']),
    reason: z.string().optional().describe('Why it ended, when it did not complete.'),
    antenna: z.strictObject({ name: z.string(), revision: z.string() }),
    range: z.string(),
    startedWallMs: z.number().describe('Milliseconds since 1970-01-01 UTC.'),
    endedWallMs: z.number().optional(),
    gainReference: z
      .strictObject({ run: z.int(), uuid: z.string(), antenna: z.string() })
      .optional()
      .describe('The reference run the gain is taken from.'),
    frequenciesHz: z.array(z.number()),
    markersHz: z.array(z.number()),
    cuts: z.array(cut),
    runFigures: z.partialRecord(z.enum(['directivityDbi', 'efficiencyDb']), perFrequency),
    match: z
      .strictObject({
        vswr: perFrequency,
        returnLossDb: perFrequency,
        resonanceHz: figureEntry,
        bestMatchHz: figureEntry,
        markerHz: z.number().optional().describe('The first marker: what lengthScale refers to.'),
        lengthScale: figureEntry,
      })
      .optional(),
    flags: z.array(flag),
  })
  .describe('Figures of one run.');

export type FiguresDocument = z.infer<typeof figuresDocument>;
export type Flag = z.infer<typeof flag>;
export type CutFigures = z.infer<typeof cut>;

/** The JSON Schema of the document, as daemon/results/schema/figures.schema.json holds it. */
export function figuresSchemaText(): string {
  return `${JSON.stringify(z.toJSONSchema(figuresDocument), undefined, 2)}\n`;
}
