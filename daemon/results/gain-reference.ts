// The gain reference of a run: which reference run it is, and the realized gain and received level that it
// gives at every frequency. Frozen into the run that uses it, so that a later reference changes nothing.
import type { Archive, GainReferenceRecord, RunRecord, SampleRecord } from '../archive/archive.ts';
import { DaemonError } from '../errors.ts';
import type { Plan } from '../files/plan-file.ts';
import type { RangeFile, ReferenceAntenna } from '../files/range-file.ts';
import { amplitudeDb } from '../pattern/decibels.ts';
import { realizedGainDbi, tableGainDbi } from '../pattern/gain-transfer.ts';
import { PatternError } from '../pattern/pattern-error.ts';
import { magnitudes, meanTrace } from './mean-trace.ts';

/** Frequencies this much apart are still the same one: analyzers answer with rounding. */
const sameFrequencyHz = 1;

/**
 * The reference that the plan asks for; undefined for none. Throws REFERENCE_MISSING when there is no such
 * complete run on this range, REFERENCE_DOES_NOT_FIT for other frequencies or too short a gain table.
 */
export async function findGainReference(
  archive: Archive,
  plan: Plan,
  range: RangeFile,
): Promise<GainReferenceRecord | undefined> {
  if (plan.kind !== 'pattern' || plan.gainReference === 'none') return undefined;
  const number =
    plan.gainReference === 'latest' ? await latestReference(archive, range.name) : plan.gainReference;
  const run = await archive.run(number);
  refuseUnfit(run, plan, range);
  const setups = await archive.setups(number);
  const frequenciesHz = Array.from(setups[0]?.sweep.frequenciesHz ?? []);
  refuseOtherGrid(run, plan, frequenciesHz);
  const samples = await archive.samples(number, { purposes: ['reference'] });
  const reference = referenceGain(run, samples, frequenciesHz);
  return { runUuid: run.uuid, runNumber: number, antenna: run.antenna.name, frequenciesHz, ...reference };
}

async function latestReference(archive: Archive, range: string): Promise<number> {
  const runs = await archive.runs();
  const latest = runs.find(
    (run) => run.kind === 'reference' && run.state === 'complete' && run.range === range,
  );
  if (latest) return latest.number;
  throw new DaemonError(
    'REFERENCE_MISSING',
    `no complete run of kind reference on range ${range}; measure the reference antenna first, or write gainReference: none`,
    { range },
  );
}

function refuseUnfit(run: RunRecord, plan: Plan, range: RangeFile): void {
  if (run.kind !== 'reference' || run.state !== 'complete') {
    throw new DaemonError(
      'REFERENCE_MISSING',
      `${plan.path}: run ${run.number} is a ${run.state} run of kind ${run.kind}, no gain reference`,
      { run: run.number, kind: run.kind, state: run.state },
    );
  }
  if (run.range !== range.name) {
    throw new DaemonError(
      'REFERENCE_DOES_NOT_FIT',
      `run ${run.number} was taken on range ${run.range}, not on ${range.name}`,
      { run: run.number },
    );
  }
}

function refuseOtherGrid(run: RunRecord, plan: Plan, frequenciesHz: readonly number[]): void {
  const { startHz, stopHz, points } = plan.band;
  const first = frequenciesHz[0] ?? 0;
  const last = frequenciesHz.at(-1) ?? 0;
  const same =
    frequenciesHz.length === points &&
    Math.abs(first - startHz) <= sameFrequencyHz &&
    Math.abs(last - stopHz) <= sameFrequencyHz;
  if (same) return;
  throw new DaemonError(
    'REFERENCE_DOES_NOT_FIT',
    `run ${run.number} has ${frequenciesHz.length} points from ${first / 1e6} to ${last / 1e6} MHz, ` +
      `the plan ${points} from ${startHz / 1e6} to ${stopHz / 1e6} MHz`,
    { run: run.number, points: frequenciesHz.length },
  );
}

function referenceGain(
  run: RunRecord,
  samples: readonly SampleRecord[],
  frequenciesHz: readonly number[],
): Pick<GainReferenceRecord, 'realizedGainDbi' | 'levelDb'> {
  const range = run.rangeFile as RangeFile;
  const { reference } = range;
  const transmission = meanTrace(samples, 'S21');
  if (!reference || !transmission) {
    throw new DaemonError(
      'REFERENCE_DOES_NOT_FIT',
      `run ${run.number} holds ${samples.length} boresight samples and ${reference ? 'a' : 'no'} gain table`,
      { run: run.number },
    );
  }
  const match = meanTrace(samples, range.analyzer.autPort === 1 ? 'S11' : 'S22');
  const reflected = match ? magnitudes(match) : undefined;
  return {
    realizedGainDbi: frequenciesHz.map((hz, k) => statedGainDbi(run, reference, hz, reflected?.[k])),
    levelDb: Array.from(magnitudes(transmission), amplitudeDb),
  };
}

function statedGainDbi(
  run: RunRecord,
  reference: ReferenceAntenna,
  frequencyHz: number,
  reflected: number | undefined,
): number {
  try {
    const figure = realizedGainDbi(tableGainDbi(reference.table, frequencyHz), reference.stated, reflected);
    if (figure.kind === 'value') return figure.value;
    throw new PatternError(figure.kind === 'absent' ? figure.because : 'only a bound of the gain is known');
  } catch (error) {
    if (!(error instanceof PatternError)) throw error;
    throw new DaemonError(
      'REFERENCE_DOES_NOT_FIT',
      `run ${run.number}: no gain of ${reference.name} at ${frequencyHz / 1e6} MHz: ${error.message}`,
      { run: run.number, frequencyHz },
      error,
    );
  }
}
