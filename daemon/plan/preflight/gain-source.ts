// Will there be a gain? The gain reference of a pattern run, or the gain table of a reference run.
import type { Plan } from '../../files/plan-file.ts';
import type { RangeFile } from '../../files/range-file.ts';
import type { Finding } from './finding.ts';
import { daysText, lengthText, megahertzText } from './wording.ts';

/** What the archive holds for the plan; whoever checks has looked before. */
export type ReferenceState =
  | { kind: 'not-asked' }
  | { kind: 'no-archive'; path: string }
  | { kind: 'refused'; because: string; nextStep: string }
  | { kind: 'found'; run: number; antenna: string; endedWallMs: number; rangeLengthM: number };

/** A reference of another day saw other cables, another temperature, other ground. Common practice, no source. */
const freshMs = 24 * 3_600_000;

export function checkGainSource(
  plan: Plan,
  range: RangeFile,
  state: ReferenceState,
  nowWallMs: number,
): Finding {
  if (plan.kind === 'reference') return checkTable(plan, range);
  const subject = 'gain-reference';
  const { name } = range;
  switch (state.kind) {
    case 'not-asked':
      return { subject, verdict: 'go', text: 'no gain is asked for (gainReference: none)', facts: {} };
    case 'no-archive': {
      const text = `there is no archive at ${state.path}, so no reference run on ${name}`;
      const change = 'measure the reference antenna first, or write gainReference: none';
      return { subject, verdict: 'no-go', text, change, facts: {} };
    }
    case 'refused':
      return { subject, verdict: 'no-go', text: state.because, change: state.nextStep, facts: {} };
    case 'found':
      return judged(state, range, nowWallMs);
  }
}

function judged(state: ReferenceState & { kind: 'found' }, range: RangeFile, nowWallMs: number): Finding {
  const subject = 'gain-reference';
  const ageMs = nowWallMs - state.endedWallMs;
  const text = `run ${state.run} on ${state.antenna}, ${daysText(ageMs)} old, at all frequencies of the plan`;
  const facts = { run: state.run, ageMs, rangeLengthM: state.rangeLengthM };
  if (state.rangeLengthM !== range.rangeLengthM) {
    const lengths = `taken at ${lengthText(state.rangeLengthM)}, the range file now says ${lengthText(range.rangeLengthM)}`;
    const change = 'measure the reference antenna at this range length';
    return { subject, verdict: 'no-go', text: `${text}; ${lengths}`, change, facts };
  }
  if (ageMs <= freshMs) return { subject, verdict: 'go', text, facts };
  return { subject, verdict: 'caution', text, change: 'measure the reference antenna the same night', facts };
}

/** For a run on the reference antenna: its table, and that it is this antenna's. */
function checkTable(plan: Plan, { reference }: RangeFile): Finding {
  const subject = 'gain-reference';
  const { startHz, stopHz } = plan.band;
  const band = `${megahertzText(startHz)} to ${megahertzText(stopHz)}`;
  const noGo = (text: string, change: string): Finding => ({
    subject,
    verdict: 'no-go',
    text,
    change,
    facts: {},
  });
  if (!reference) {
    return noGo('the range file names no reference antenna', 'give antennas.reference with its gain table');
  }
  if (reference.name !== plan.antenna.name) {
    const text = `the plan measures ${plan.antenna.name}, the gain table is that of ${reference.name}`;
    return noGo(text, 'give them one name');
  }
  const tableStartHz = reference.table[0]?.frequencyHz ?? Number.POSITIVE_INFINITY;
  const tableStopHz = reference.table.at(-1)?.frequencyHz ?? Number.NEGATIVE_INFINITY;
  const covers = `the gain table of ${reference.name} covers ${megahertzText(tableStartHz)} to ${megahertzText(tableStopHz)}`;
  if (tableStartHz > startHz || tableStopHz < stopHz) {
    return noGo(`${covers}, the plan ${band}`, 'widen the table or narrow the band');
  }
  return {
    subject,
    verdict: 'go',
    text: `${covers}, the plan ${band}`,
    facts: { tableStartHz, tableStopHz },
  };
}
