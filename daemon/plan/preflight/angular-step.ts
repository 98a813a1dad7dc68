// Are the angles close enough for the pattern to be known between them?
import type { Plan } from '../../files/plan-file.ts';
import type { RangeFile } from '../../files/range-file.ts';
import { wavelengthM } from '../../pattern/friis.ts';
import { type Finding, notChecked } from './finding.ts';
import { measuredAntenna } from './measured-antenna.ts';
import { degreesText, lengthText, megahertzText } from './wording.ts';

/**
 * Largest step in degrees at which levels are sampled densely enough, λ/(4r).
 *
 * All that radiates lies within r of the axis; its field varies no faster than e^{±jkrφ}, its level no faster
 * than twice that, which two samples per period catch. Source: sampling theorem on a cut, as IEEE Std 149 uses
 * it with half the step for levels. Checked: tests/unit/daemon/plan/preflight/angular-step.test.ts.
 */
export function largestStepDeg(radiusM: number, frequencyHz: number): number {
  return (wavelengthM(frequencyHz) / (4 * radiusM)) * (180 / Math.PI);
}

/** The step of every cut against λ/(4r) at the top of the band; r is half the AUT and its offset from the axis. */
export function checkAngularStep(plan: Plan, range: RangeFile): Finding {
  const subject = 'angular-step';
  const { cuts } = plan;
  if (cuts.length === 0)
    return { subject, verdict: 'go', text: 'boresight alone, no cut is swept', facts: {} };
  const { sizeM, sizeKey } = measuredAntenna(plan, range);
  const { autOffsetM } = range;
  if (sizeM === undefined || autOffsetM === undefined) {
    const missing = sizeM === undefined ? [sizeKey] : [];
    const offset = 'autOffset in the range file (0 m when the AUT turns about its middle)';
    return notChecked(subject, autOffsetM === undefined ? [...missing, offset] : missing);
  }
  const radiusM = autOffsetM + sizeM / 2;
  const limitDeg = largestStepDeg(radiusM, plan.band.stopHz);
  const widest = cuts.reduce((worst, cut) => (cut.stepDeg > worst.stepDeg ? cut : worst));
  const text =
    `widest step ${degreesText(widest.stepDeg)} (cut ${widest.name}); λ/(4r) at ${megahertzText(plan.band.stopHz)} ` +
    `with ${lengthText(radiusM)} about the axis is ${degreesText(limitDeg)}`;
  const facts = { stepDeg: widest.stepDeg, limitDeg, radiusM };
  if (widest.stepDeg <= limitDeg) return { subject, verdict: 'go', text, facts };
  const offset = autOffsetM > 0 ? ', or mount the AUT nearer to the axis' : '';
  const change = `step by at most ${degreesText(Math.floor(limitDeg * 100) / 100)}${offset}`;
  return { subject, verdict: 'no-go', text, change, facts };
}
