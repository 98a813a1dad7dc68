// What the files tell beforehand of the antenna on the positioner: the AUT in a plan of kind pattern, the
// reference antenna in a plan of kind reference.
import type { Plan } from '../../files/plan-file.ts';
import type { RangeFile } from '../../files/range-file.ts';
import { tableGainDbi } from '../../pattern/gain-transfer.ts';

export interface MeasuredAntenna {
  sizeM?: number;
  gainDbi?: number;
  /** The keys that would tell, for checks that miss them. */
  sizeKey: string;
  gainKey: string;
}

/** The plan's own words go before the range file's. */
export function measuredAntenna(plan: Plan, range: RangeFile): MeasuredAntenna {
  const keys = { sizeKey: 'antenna.size in the plan', gainKey: 'antenna.expectedGain in the plan' };
  if (plan.kind === 'pattern') return { ...keys, ...plan.expected };
  return { ...keys, ...fromRange(plan, range), ...plan.expected };
}

function fromRange(plan: Plan, { reference }: RangeFile): { sizeM?: number; gainDbi?: number } {
  if (!reference) return {};
  const size = reference.sizeM === undefined ? {} : { sizeM: reference.sizeM };
  const { startHz, stopHz } = plan.band;
  const first = reference.table[0]?.frequencyHz ?? Number.POSITIVE_INFINITY;
  const last = reference.table.at(-1)?.frequencyHz ?? Number.NEGATIVE_INFINITY;
  // A table that does not reach is told by the check of the gain reference.
  if (first > startHz || last < stopHz) return size;
  return { ...size, gainDbi: tableGainDbi(reference.table, stopHz) };
}
