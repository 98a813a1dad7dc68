// Are the frequencies close enough for late echoes not to pass for early ones?
import type { Plan } from '../../files/plan-file.ts';
import type { RangeFile } from '../../files/range-file.ts';
import { speedOfLightMS } from '../../pattern/friis.ts';
import { aliasFreePathM } from '../../pattern/path-resolution.ts';
import type { Finding } from './finding.ts';
import { hertzText, lengthText } from './wording.ts';

/** The wave that goes to the far antenna, back and there again: the longest strong way. Common practice, no source. */
export const tripleTravel = 3;

/** Alias-free path c/Δf against three times the range length. */
export function checkFrequencyGrid(plan: Plan, range: RangeFile): Finding {
  const { startHz, stopHz, points } = plan.band;
  const spanHz = stopHz - startHz;
  const stepHz = spanHz / (points - 1);
  const aliasFreeM = aliasFreePathM(stepHz);
  const longestM = tripleTravel * range.rangeLengthM;
  const text =
    `steps of ${hertzText(stepHz)} tell ways up to ${lengthText(aliasFreeM)} apart; ` +
    `there, back and there again is ${lengthText(longestM)}`;
  const facts = { stepHz, aliasFreeM, longestM };
  if (aliasFreeM >= longestM) return { subject: 'frequency-grid', verdict: 'go', text, facts };
  const needed = Math.ceil((spanHz * longestM) / speedOfLightMS - 1e-9) + 1;
  const change = `take at least ${needed} points, or gating would fold late echoes onto early ones`;
  return { subject: 'frequency-grid', verdict: 'caution', text, change, facts };
}
