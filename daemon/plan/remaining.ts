// What is left of a run after an interruption. Pure: planned steps against stored samples.
import type { SampleRecord } from '../archive/archive.ts';
import type { PlannedStep } from './expand.ts';

export type StoredSample = Pick<SampleRecord, 'purpose' | 'cut' | 'angleDeg'>;

/**
 * The planned steps still to be taken, in order. Samples pair with stored ones by cut, purpose and pattern
 * angle, equal ones one by one. Ties do not pair: a segment has its own time and homing, so every stretch
 * of samples that is left lies between two ties of the new segment, and only those ties are kept.
 */
export function remaining(planned: readonly PlannedStep[], stored: readonly StoredSample[]): PlannedStep[] {
  const taken = new Map<string, number>();
  for (const sample of stored) {
    if (sample.purpose !== 'tie' && sample.purpose !== 'repeat')
      taken.set(keyOf(sample), (taken.get(keyOf(sample)) ?? 0) + 1);
  }
  const isLeft = planned.map((step) => {
    const count = taken.get(keyOf(step)) ?? 0;
    if (step.purpose === 'tie' || count === 0) return step.purpose !== 'tie';
    taken.set(keyOf(step), count - 1);
    return false;
  });
  return planned.filter((step, i) => {
    if (step.purpose !== 'tie') return isLeft[i];
    return stretchHasLeft(planned, isLeft, i, -1) || stretchHasLeft(planned, isLeft, i, 1);
  });
}

/** Whether the samples of the same cut next to a tie, up to the next tie, hold one that is left. */
function stretchHasLeft(
  planned: readonly PlannedStep[],
  isLeft: readonly boolean[],
  tie: number,
  direction: 1 | -1,
): boolean {
  for (let i = tie + direction; ; i += direction) {
    const step = planned[i];
    if (step === undefined || step.purpose === 'tie' || step.cut !== planned[tie]!.cut) return false;
    if (isLeft[i]) return true;
  }
}

function keyOf(sample: StoredSample): string {
  // A millionth of a degree: stored angles have been through a database.
  return JSON.stringify([sample.cut, sample.purpose, Math.round(sample.angleDeg * 1e6) + 0]);
}
