// What will be radiated, and how far people should keep from the beam. Local limits and licences go first.
import type { Plan } from '../../files/plan-file.ts';
import type { RangeFile } from '../../files/range-file.ts';
import { densityDistanceM, eirpW, fccPublicWM2, icnirpPublicWM2 } from '../../pattern/power-density.ts';
import { type Finding, notChecked } from './finding.ts';
import { measuredAntenna } from './measured-antenna.ts';
import { lengthText, wattsText } from './wording.ts';

/** Nearer than this nobody stands by chance. Common practice, no source. */
export const armsLengthM = 0.5;

/**
 * EIRP of the antenna that is driven, cable losses not taken off, and the distance at which the far-field
 * formula S = EIRP/(4πd²) comes down to the limit: the operator's own, or the lower of the two public ones for
 * the general public. Continuous power in free space is assumed.
 */
export function checkRadiatedPower(plan: Plan, range: RangeFile): Finding {
  const subject = 'radiated-power';
  const driven = drivenAntennas(plan, range);
  const missing = driven.flatMap(({ gainDbi, key }) => (gainDbi === undefined ? [key] : []));
  const limit = limitOf(plan, range);
  if (limit === undefined) missing.push('cautionLimit in the range file');
  if (missing.length > 0 || limit === undefined) return notChecked(subject, missing);
  const strongest = driven.reduce((a, b) => ((b.gainDbi ?? 0) > (a.gainDbi ?? 0) ? b : a));
  const radiatedW = eirpW(plan.analyzer.powerDbm, strongest.gainDbi ?? 0);
  const distanceM = densityDistanceM(radiatedW, limit.wM2);
  const text =
    `${strongest.name} radiates up to ${wattsText(radiatedW)} EIRP; ${Number(limit.wM2.toPrecision(3))} W/m² ` +
    `(${limit.source}) is kept from ${lengthText(distanceM)} on, over ground perhaps from twice that; ` +
    'local limits and licences go first';
  const facts = { eirpW: radiatedW, limitWM2: limit.wM2, distanceM };
  if (2 * distanceM <= armsLengthM) return { subject, verdict: 'go', text, facts };
  const change = `keep everybody ${lengthText(2 * distanceM)} from the beam, or lower the power`;
  return { subject, verdict: 'caution', text, change, facts };
}

interface Driven {
  name: string;
  gainDbi?: number;
  key: string;
}

/** S21 drives port 1; the match of an AUT on port 2 drives that as well. */
function drivenAntennas(plan: Plan, range: RangeFile): Driven[] {
  const { gainDbi, gainKey } = measuredAntenna(plan, range);
  const aut = { name: plan.antenna.name, key: gainKey, ...(gainDbi === undefined ? {} : { gainDbi }) };
  if (range.analyzer.autPort === 1) return [aut];
  const { rangeAntennaGainDbi } = range;
  const key = 'antennas.rangeAntennaGain in the range file';
  const known = rangeAntennaGainDbi === undefined ? {} : { gainDbi: rangeAntennaGainDbi };
  return [{ name: range.rangeAntenna, key, ...known }, aut];
}

/** Both public limits rise or stay with frequency from 30 MHz on: the bottom of the band has the lowest. */
function limitOf(plan: Plan, range: RangeFile): { wM2: number; source: string } | undefined {
  if (range.cautionLimitWM2 !== undefined) return { wM2: range.cautionLimitWM2, source: 'cautionLimit' };
  const levels = [icnirpPublicWM2(plan.band.startHz), fccPublicWM2(plan.band.startHz)];
  const known = levels.flatMap((figure) => (figure.kind === 'absent' ? [] : [figure.value]));
  if (known.length === 0) return undefined;
  const source = 'the lower of ICNIRP 2020 and 47 CFR 1.1310 for the general public';
  return { wM2: Math.min(...known), source };
}
