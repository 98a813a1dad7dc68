// One run of the archive → the document `figures/1`. Reads, collects and names; mathematics is in pattern/.
import type { Archive, RunRecord, SampleRecord } from '../archive/archive.ts';
import type { Plan, PlanCut } from '../files/plan-file.ts';
import type { RangeFile } from '../files/range-file.ts';
import { absentFigure, type Figure } from '../pattern/figure.ts';
import { cutFigures } from '../pattern/figures.ts';
import { gainConstantDb, ieeeGainDbi } from '../pattern/gain-transfer.ts';
import { meanNoise } from '../pattern/mean-noise.ts';
import { tieNoiseDb } from '../pattern/tie-noise.ts';
import { type CutLevels, cutLevels } from './cut-levels.ts';
import { entryOf } from './figure-entry.ts';
import { type CutFigures, cutFigureKeys, type FiguresDocument, type Flag } from './figures-document.ts';
import { cutFlags, repeatFlags, runFlags } from './flags.ts';
import { matchFigures } from './match-figures.ts';
import { magnitudes, meanTrace } from './mean-trace.ts';

export interface FiguresOptions {
  /** Also the levels of every cut, for plots. */
  levels?: boolean;
}

/** Throws ARCHIVE_NO_SUCH_RUN, ARCHIVE_DAMAGED. */
export async function runFigures(
  archive: Archive,
  number: number,
  options: FiguresOptions = {},
): Promise<FiguresDocument> {
  const run = await archive.run(number);
  const setups = await archive.setups(number);
  const segments = await archive.segments(number);
  const samples = await archive.samples(number);
  const frequenciesHz = Array.from(setups[0]?.sweep.frequenciesHz ?? []);
  const plan = run.plan as Plan;
  const reflection = autReflection(run, samples);
  const floorDb = sweepNoiseDb(samples, frequenciesHz);
  const cuts: CutFigures[] = [];
  const flags: Flag[] = runFlags(setups, segments.length, run.state);
  flags.push(...repeatFlags(plan, await archive.events(number)));
  for (const cut of frequenciesHz.length > 0 ? plan.cuts : []) {
    const levels = cutLevels(samples, cut.name, frequenciesHz, floorDb);
    const figures = figuresOfCut(run, cut, levels, frequenciesHz, reflection, options);
    cuts.push(figures);
    flags.push(...cutFlags(plan, cut, levels, figures));
  }
  return {
    ...head(run, plan, frequenciesHz),
    cuts,
    runFigures: {},
    ...matchPart(run, samples, frequenciesHz, reflection),
    flags,
  };
}

type DocumentHead = Omit<FiguresDocument, 'cuts' | 'runFigures' | 'match' | 'flags'>;

function head(run: RunRecord, plan: Plan, frequenciesHz: number[]): DocumentHead {
  const { gainReference } = run;
  return {
    nightcut: 'figures/1',
    run: run.number,
    uuid: run.uuid,
    kind: run.kind,
    state: run.state,
    ...(run.reason === undefined ? {} : { reason: run.reason }),
    antenna: run.antenna,
    range: run.range,
    startedWallMs: run.startedWallMs,
    ...(run.endedWallMs === undefined ? {} : { endedWallMs: run.endedWallMs }),
    ...(gainReference
      ? {
          gainReference: {
            run: gainReference.runNumber,
            uuid: gainReference.runUuid,
            antenna: gainReference.antenna,
          },
        }
      : {}),
    frequenciesHz,
    markersHz: [...plan.markersHz],
  };
}

/** Mean reflection of the AUT over all boresight visits. */
function autReflection(run: RunRecord, samples: readonly SampleRecord[]): Float64Array | undefined {
  return meanTrace(samples, reflectionOf(run));
}

/** The port of the AUT is the range file's. */
function reflectionOf(run: RunRecord): 'S11' | 'S22' {
  return (run.rangeFile as RangeFile).analyzer.autPort === 1 ? 'S11' : 'S22';
}

/** What repeated sweeps at boresight show of the floor; leakage is not in it. */
function sweepNoiseDb(
  samples: readonly SampleRecord[],
  frequenciesHz: readonly number[],
): Float64Array | undefined {
  const visits = samples.filter(({ purpose }) => purpose === 'tie' || purpose === 'reference');
  return tieNoiseDb(
    frequenciesHz,
    visits.flatMap((visit) => visit.traces.get('S21') ?? []),
  );
}

function matchPart(
  run: RunRecord,
  samples: readonly SampleRecord[],
  frequenciesHz: number[],
  reflection: Float64Array | undefined,
): Pick<FiguresDocument, 'match'> {
  if (frequenciesHz.length === 0 || !reflection) return {};
  const visits = samples.flatMap((sample) => sample.traces.get(reflectionOf(run)) ?? []);
  const markerHz = (run.plan as Plan).markersHz[0];
  return { match: matchFigures(frequenciesHz, reflection, markerHz, meanNoise(frequenciesHz, visits)) };
}

function figuresOfCut(
  run: RunRecord,
  cut: PlanCut,
  levels: CutLevels,
  frequenciesHz: readonly number[],
  reflection: Float64Array | undefined,
  options: FiguresOptions,
): CutFigures {
  const reflected = reflection && magnitudes(reflection);
  const rows = frequenciesHz.map((_, k) => rowOfFigures(run, levels, k, reflected?.[k]));
  const keys = Object.keys(rows[0] ?? {}) as (keyof CutFigures['figures'])[];
  return {
    name: cut.name,
    axis: cut.axis,
    plane: cut.plane,
    at: { ...cut.at },
    autRollDeg: cut.autRollDeg,
    component: cut.component,
    gated: false,
    anglesDeg: Array.from(levels.cuts[0]?.anglesDeg ?? []),
    ...(options.levels ? { levelDb: levels.cuts.map((one) => Array.from(one.levelDb)) } : {}),
    figures: Object.fromEntries(keys.map((key) => [key, rows.map((row) => entryOf(row[key]!))])),
  };
}

type FigureRow = Partial<Record<keyof CutFigures['figures'], Figure>>;

function rowOfFigures(
  run: RunRecord,
  levels: CutLevels,
  k: number,
  reflected: number | undefined,
): FigureRow {
  const beside: FigureRow = { closureDb: levels.closureDb[k]!, driftDb: levels.driftDb[k]! };
  const cut = levels.cuts[k];
  if (!cut) return { ...noFigures(levels.because ?? 'the cut has no samples'), ...beside };
  const { gainReference } = run;
  const constantDb =
    gainReference &&
    gainConstantDb({
      referenceGainDbi: gainReference.realizedGainDbi[k]!,
      referenceLevelDb: gainReference.levelDb[k]!,
    });
  const floorDb = levels.floorDb?.[k];
  const figures: FigureRow = cutFigures(cut, {
    ...(constantDb === undefined ? {} : { gainConstantDb: constantDb }),
    ...(floorDb === undefined ? {} : { floorDb }),
  });
  const realized = figures.realizedGainDbi ?? absentFigure('the run has no gain reference');
  return {
    ...figures,
    realizedGainDbi: realized,
    gainDbi: ieeeGain(realized, reflected),
    ...beside,
  };
}

function noFigures(because: string): FigureRow {
  return Object.fromEntries(cutFigureKeys.map((key) => [key, absentFigure(because)]));
}

function ieeeGain(realized: Figure, reflected: number | undefined): Figure {
  if (realized.kind !== 'value') return realized;
  if (reflected === undefined) return absentFigure('the match of the antenna was not measured');
  return ieeeGainDbi(realized.value, reflected);
}
