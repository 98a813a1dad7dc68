// What one check before the night found. A check judges values it is handed; it reads no file, no clock and no
// device. A check that lacks an input says which, and then speaks neither for nor against the night.

/** `caution`: the night can go, with something to know before its figures are believed or people come near. */
export type Verdict = 'go' | 'caution' | 'no-go' | 'not-checked';

export const subjects = [
  'far-field',
  'link-budget',
  'angular-step',
  'ground-bounce',
  'wall-echo',
  'frequency-grid',
  'travel',
  'duration',
  'radiated-power',
  'gain-reference',
  'disk-space',
] as const;

export type Subject = (typeof subjects)[number];

export interface Finding {
  subject: Subject;
  verdict: Verdict;
  /** What was found and against which demand, in one line. */
  text: string;
  /** What the operator can change, where there is something. */
  change?: string;
  /** The numbers behind the text, by names that end in their unit. */
  facts: Readonly<Record<string, number>>;
}

/** A check without its input; `missing` are keys of the written files with the file that takes them. */
export function notChecked(subject: Subject, missing: readonly string[]): Finding {
  return { subject, verdict: 'not-checked', text: `give ${missing.join(', ')}`, facts: {} };
}
