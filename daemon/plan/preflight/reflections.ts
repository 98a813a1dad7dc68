// What ground and walls can add to the direct wave, and whether the band could tell them from it.
import type { Plan } from '../../files/plan-file.ts';
import type { RangeFile } from '../../files/range-file.ts';
import { excessPathM, lobingHeightM, rippleDb, strongestEchoDb, type TwoRays } from '../../pattern/echo.ts';
import { speedOfLightMS } from '../../pattern/friis.ts';
import { echoPeriodHz, kaiser6Widening, windowedResolutionM } from '../../pattern/path-resolution.ts';
import { type Finding, notChecked, type Subject } from './finding.ts';
import { decibelText, enoughMetresText, lengthText, megahertzText } from './wording.ts';

/** An echo this far down moves a level by less than 0.5 dB either way. Common practice, no source. */
export const harmlessEchoDb = -25.1;

/** Ground reflection from the heights of both antennas. */
export function checkGroundBounce(plan: Plan, range: RangeFile): Finding {
  const { heights, rangeLengthM } = range;
  if (!heights) return notChecked('ground-bounce', ['heights in the range file']);
  const { rangeAntennaM, autM } = heights;
  const stepM = Math.abs(rangeAntennaM - autM);
  if (stepM >= rangeLengthM) {
    const text = `heights differ by ${lengthText(stepM)} on a range of ${lengthText(rangeLengthM)}: one of them is wrong`;
    return {
      subject: 'ground-bounce',
      verdict: 'no-go',
      text,
      change: 'measure heights and rangeLength again',
      facts: { rangeLengthM },
    };
  }
  const alongM = Math.sqrt(rangeLengthM ** 2 - stepM ** 2);
  const rays = { alongM, firstM: rangeAntennaM, secondM: autM };
  const lobingM = lobingHeightM(plan.band.startHz, rangeLengthM, rangeAntennaM);
  const look = `move the AUT up or down by ${lengthText(lobingM)} to see all it does`;
  return judged('ground-bounce', rays, plan, (neededM) => `raise both antennas to ${neededM}`, look);
}

/** Reflection at the nearest wall, taken as parallel to the line between the antennas. */
export function checkWallEcho(plan: Plan, range: RangeFile): Finding {
  const { nearestWallM, rangeLengthM } = range;
  if (nearestWallM === undefined) return notChecked('wall-echo', ['nearestWall in the range file']);
  const rays = { alongM: rangeLengthM, firstM: nearestWallM, secondM: nearestWallM };
  return judged('wall-echo', rays, plan, (neededM) => `keep walls ${neededM} away`);
}

/** Go only where even a perfect mirror does no harm; all else depends on antennas and ground. */
function judged(
  subject: Subject,
  rays: TwoRays,
  plan: Plan,
  farther: (neededM: string) => string,
  look?: string,
): Finding {
  const echoDb = strongestEchoDb(rays);
  const excessM = excessPathM(rays);
  const spanHz = plan.band.stopHz - plan.band.startHz;
  const resolutionM = windowedResolutionM(spanHz);
  const { risesDb, fallsDb } = rippleDb(echoDb);
  const couldBeGated = excessM >= resolutionM;
  const facts = { echoDb, excessM, resolutionM, risesDb, fallsDb };
  const told =
    `a mirror there and antennas without directivity: ${decibelText(echoDb)}, +${decibelText(risesDb)} to ` +
    `${decibelText(fallsDb)} every ${megahertzText(echoPeriodHz(excessM))}; ${lengthText(excessM)} longer, ` +
    `the band resolves ${lengthText(resolutionM)}: gating could ${couldBeGated ? '' : 'not '}part them`;
  if (echoDb <= harmlessEchoDb) return { subject, verdict: 'go', text: told, facts };
  const see = look === undefined ? [] : [look];
  if (couldBeGated) {
    const dampen = 'absorb or tilt what reflects; figures are ungated';
    return { subject, verdict: 'caution', text: told, change: [dampen, ...see].join('; '), facts };
  }
  const neededM = distanceForExcessM(Math.hypot(rays.alongM, rays.firstM - rays.secondM), resolutionM);
  const widerHz = (kaiser6Widening * speedOfLightMS) / excessM;
  const change = `${farther(enoughMetresText(neededM))} or widen the band to ${Math.ceil(widerHz / 1e6)} MHz`;
  return { subject, verdict: 'caution', text: told, change: [change, ...see].join('; '), facts };
}

/** Equal distances from the surface at which the reflected way is longer by so much. */
export function distanceForExcessM(alongM: number, excessM: number): number {
  return Math.sqrt((alongM + excessM) ** 2 - alongM ** 2) / 2;
}
