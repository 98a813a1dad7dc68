// Does enough arrive? The peak of the pattern over the noise of the receiver, by the Friis equation.
import type { Plan } from '../../files/plan-file.ts';
import type { RangeFile } from '../../files/range-file.ts';
import { powerDb, powerRatio } from '../../pattern/decibels.ts';
import { flagMarginDb } from '../../pattern/floor.ts';
import { transmissionDb } from '../../pattern/friis.ts';
import { type Finding, notChecked } from './finding.ts';
import { measuredAntenna } from './measured-antenna.ts';
import { decibelText, hertzText } from './wording.ts';

/** How far below the peak a level shall still be told from noise. Common practice, no source. */
export const wantedDepthDb = 30;

/**
 * Mean noise with other settings than it was read with: it goes with the bandwidth, and averaging N coherent
 * sweeps takes 10 log N off. Source: statistics of white noise. Checked: tests/outside (C-SNR-AVG).
 */
export function noiseDbm(
  floor: { levelDbm: number; ifBandwidthHz: number },
  settings: { ifBandwidthHz: number; averages: number },
): number {
  const narrowerDb = powerDb(floor.ifBandwidthHz / settings.ifBandwidthHz);
  return floor.levelDbm - narrowerDb - powerDb(settings.averages);
}

/**
 * No-go when even the peak lies nearer to the noise than levels are trusted (20 dB), caution when one 30 dB
 * below the peak does. At the top of the band, where free space takes most.
 */
export function checkLinkBudget(plan: Plan, range: RangeFile): Finding {
  const { gainDbi, gainKey } = measuredAntenna(plan, range);
  const { rangeAntennaGainDbi, cableLossDb, rangeLengthM } = range;
  const { noiseFloor } = range.analyzer;
  if (
    gainDbi === undefined ||
    rangeAntennaGainDbi === undefined ||
    cableLossDb === undefined ||
    noiseFloor === undefined
  ) {
    return notChecked('link-budget', [
      ...(rangeAntennaGainDbi === undefined ? ['antennas.rangeAntennaGain in the range file'] : []),
      ...(gainDbi === undefined ? [gainKey] : []),
      ...(cableLossDb === undefined ? ['cableLoss in the range file'] : []),
      ...(noiseFloor === undefined ? ['analyzer.noiseFloor in the range file'] : []),
    ]);
  }
  const wayDb = transmissionDb(gainDbi, rangeAntennaGainDbi, rangeLengthM, plan.band.stopHz);
  const receivedDbm = plan.analyzer.powerDbm + wayDb - cableLossDb;
  const floorDbm = noiseDbm(noiseFloor, plan.analyzer);
  return judged(plan, { receivedDbm, floorDbm, marginDb: receivedDbm - floorDbm });
}

function judged(plan: Plan, facts: { receivedDbm: number; floorDbm: number; marginDb: number }): Finding {
  const { receivedDbm, floorDbm, marginDb } = facts;
  const wantedDb = flagMarginDb + wantedDepthDb;
  const text =
    `peak at ${decibelText(receivedDbm)}m, noise at ${decibelText(floorDbm)}m: ${decibelText(marginDb)} over it; ` +
    `${wantedDb} dB let a level ${wantedDepthDb} dB below the peak be trusted, ${flagMarginDb} dB only the peak`;
  const subject = 'link-budget';
  if (marginDb >= wantedDb) return { subject, verdict: 'go', text, facts };
  const missingDb = wantedDb - marginDb;
  const narrower = hertzText(plan.analyzer.ifBandwidthHz / powerRatio(missingDb));
  const averages = Math.ceil(plan.analyzer.averages * powerRatio(missingDb));
  const change = `gain ${decibelText(missingDb)}: more power, an IF bandwidth of ${narrower}, or ${averages} averages`;
  return { subject, verdict: marginDb < flagMarginDb ? 'no-go' : 'caution', text, change, facts };
}
