// The end of every run, good or bad: motors still, source off (safety invariant 4). Each device is tried
// whatever happened to the other, and what could not be confirmed is reported, never swallowed.
import type { Analyzer } from '../../drivers/analyzer/analyzer.ts';
import type { Positioner } from '../../drivers/positioner/positioner.ts';

export interface Bench {
  analyzer: Analyzer;
  positioner: Positioner;
}

/** Returns what could not be confirmed; empty when motors are still and the source is off. */
export async function safeStop({ analyzer, positioner }: Bench): Promise<unknown[]> {
  const outcomes = await Promise.allSettled([positioner.stop(), analyzer.source(false)]);
  return outcomes.flatMap((outcome) => (outcome.status === 'rejected' ? [outcome.reason] : []));
}
