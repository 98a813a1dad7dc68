// Is the range long enough for the pattern to be that of the far field?
import type { Plan } from '../../files/plan-file.ts';
import type { RangeFile } from '../../files/range-file.ts';
import { farFieldDistanceM } from '../../pattern/far-field.ts';
import { speedOfLightMS, wavelengthM } from '../../pattern/friis.ts';
import { type Finding, notChecked } from './finding.ts';
import { measuredAntenna } from './measured-antenna.ts';
import { enoughMetresText, lengthText, megahertzText } from './wording.ts';

/** Distances in largest dimensions and in wavelengths. Common practice, no source. */
export const leastSizes = 10;
export const leastWavelengths = 5;

/**
 * Three demands, the largest counts: 2(D₁+D₂)²/λ at the top of the band (IEEE Std 149 with the dimensions of
 * both antennas), 10 D of the larger antenna, and 5 λ at the bottom of the band (common practice, no source).
 */
export function checkFarField(plan: Plan, range: RangeFile): Finding {
  const { sizeM, sizeKey } = measuredAntenna(plan, range);
  const { rangeAntennaSizeM, rangeLengthM } = range;
  if (sizeM === undefined || rangeAntennaSizeM === undefined) {
    const missing = rangeAntennaSizeM === undefined ? ['antennas.rangeAntennaSize in the range file'] : [];
    return notChecked('far-field', sizeM === undefined ? [...missing, sizeKey] : missing);
  }
  const { startHz, stopHz } = plan.band;
  const bothM = sizeM + rangeAntennaSizeM;
  const curvatureM = farFieldDistanceM(bothM, stopHz);
  const sizesM = leastSizes * Math.max(sizeM, rangeAntennaSizeM);
  const wavelengthsM = leastWavelengths * wavelengthM(startHz);
  const neededM = Math.max(curvatureM, sizesM, wavelengthsM);
  const text =
    `range length ${lengthText(rangeLengthM)}; 2(D₁+D₂)²/λ at ${megahertzText(stopHz)} is ${lengthText(curvatureM)}, ` +
    `${leastSizes} D is ${lengthText(sizesM)}, ${leastWavelengths} λ at ${megahertzText(startHz)} is ${lengthText(wavelengthsM)}`;
  const facts = { rangeLengthM, neededM, curvatureM, sizesM, wavelengthsM };
  if (rangeLengthM >= neededM) return { subject: 'far-field', verdict: 'go', text, facts };
  const longer = `make the range at least ${enoughMetresText(neededM)} long`;
  const othersKept = rangeLengthM >= Math.max(sizesM, wavelengthsM);
  const topHz = (rangeLengthM * speedOfLightMS) / (2 * bothM * bothM);
  const lower = othersKept && topHz > startHz ? `, or end the band at ${Math.floor(topHz / 1e6)} MHz` : '';
  return { subject: 'far-field', verdict: 'no-go', text, change: `${longer}${lower}`, facts };
}
