// The text of a plan file to a Plan, checked field by field and between fields. Whether the range can do it
// (axes, travel) is plan/expand.ts's business.
import { resolve } from 'node:path';
import { checkText, type Finding } from './check-tree.ts';
import type { Plan, PlanCut } from './plan-file.ts';
import { mostSteps, type PlanText, planSchema } from './plan-schema.ts';

/** `path` as the operator wrote it, for messages. Throws FILE_INVALID. */
export function parsePlan(text: string, path: string): Plan {
  const written = checkText(text, path, planSchema, checkPlan);
  const { band, analyzer, kind } = written;
  return {
    path: resolve(path),
    text,
    kind,
    antenna: { name: written.antenna.name, revision: written.antenna.revision },
    ...expectedOf(written.antenna),
    band: { startHz: band.from, stopHz: band.to, points: band.points },
    markersHz: written.markers,
    analyzer: {
      ifBandwidthHz: analyzer.ifBandwidth,
      powerDbm: analyzer.power,
      averages: analyzer.averages,
    },
    gainReference: written.gainReference ?? (kind === 'reference' ? 'none' : 'latest'),
    cuts: written.cuts.map(cutOf),
    tieEverySamples: written.ties.every,
    checks: { closureDb: written.checks.closure, driftDb: written.checks.drift },
  };
}

function expectedOf({ size, expectedGain }: PlanText['antenna']): Pick<Plan, 'expected'> {
  if (size === undefined && expectedGain === undefined) return {};
  return {
    expected: {
      ...(size === undefined ? {} : { sizeM: size }),
      ...(expectedGain === undefined ? {} : { gainDbi: expectedGain }),
    },
  };
}

function cutOf(cut: CutText): PlanCut {
  const span = cut.to - cut.from;
  return {
    name: cut.name,
    axis: cut.axis,
    plane: cut.plane,
    fromDeg: cut.from,
    toDeg: cut.to,
    // A step written with ten digits is meant to divide the span exactly.
    stepDeg: span / Math.round(span / cut.step),
    at: cut.at,
    autRollDeg: cut.autRoll,
    component: cut.component,
  };
}

type CutText = PlanText['cuts'][number];

function checkPlan(written: PlanText): Finding[] {
  const { band, markers, kind, cuts } = written;
  const findings: Finding[] = [];
  if (band.from >= band.to) {
    findings.push({ path: ['band', 'to'], expectation: 'a frequency above band.from' });
  } else findings.push(...checkMarkers(markers, band));
  if (kind === 'reference' && (written.gainReference ?? 'none') !== 'none') {
    const advice = 'a reference run takes its gain from the table in the range file';
    findings.push({ path: ['gainReference'], expectation: 'none in a plan of kind reference', advice });
  }
  if (kind === 'pattern' && cuts.length === 0) {
    findings.push({ path: ['cuts'], expectation: 'at least one cut in a plan of kind pattern' });
  }
  const names = new Map<string, number>();
  for (const [i, cut] of cuts.entries()) {
    findings.push(...checkCut(cut, ['cuts', i]));
    const first = names.get(cut.name.toLowerCase());
    if (first === undefined) names.set(cut.name.toLowerCase(), i);
    else
      findings.push({ path: ['cuts', i, 'name'], expectation: `another name than that of cuts[${first}]` });
  }
  return findings;
}

function checkMarkers(markers: readonly number[], band: PlanText['band']): Finding[] {
  return markers.flatMap((marker, i) => {
    if (marker < band.from || marker > band.to) {
      return [{ path: ['markers', i], expectation: 'a frequency within the band' }];
    }
    const twice = markers.indexOf(marker) < i;
    return twice ? [{ path: ['markers', i], expectation: 'every marker once' }] : [];
  });
}

function checkCut(cut: CutText, path: (string | number)[]): Finding[] {
  const findings: Finding[] = [];
  if (Object.hasOwn(cut.at, cut.axis)) {
    const expectation = `only the other axes: ${cut.axis} is swept`;
    findings.push({ path: [...path, 'at', cut.axis], expectation });
  }
  const span = cut.to - cut.from;
  if (span <= 0) return [...findings, { path: [...path, 'to'], expectation: 'an angle above from' }];
  if (span > 360)
    return [...findings, { path: [...path, 'to'], expectation: 'an angle at most 360 deg above from' }];
  const steps = span / cut.step;
  const expectation = steps > mostSteps + 0.5 ? tooFine(span) : doesNotDivide(span, steps);
  return expectation === undefined ? findings : [...findings, { path: [...path, 'step'], expectation }];
}

function tooFine(span: number): string {
  return `at most ${mostSteps} steps in a cut: ${degreesText(span / mostSteps)} or more`;
}

/** What to write instead when the step does not divide the span, to a millionth of a step. */
function doesNotDivide(span: number, steps: number): string | undefined {
  if (steps >= 1 && Math.abs(steps - Math.round(steps)) <= 1e-6) return undefined;
  const finer = degreesText(span / Math.ceil(steps));
  const coarser = steps > 1 ? `${degreesText(span / Math.floor(steps))} or ` : '';
  return `a step that divides the ${degreesText(span)} of the cut, such as ${coarser}${finer}`;
}

/** Enough digits that the text, written back as a step, divides the span. */
function degreesText(angleDeg: number): string {
  return `${Number(angleDeg.toPrecision(12))} deg`;
}
