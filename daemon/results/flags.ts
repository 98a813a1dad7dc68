// What a reader of the figures must know before trusting them. Judged by the median over the band: one
// frequency in a null says nothing of the range.
import type { RunEventRecord, SetupRecord } from '../archive/archive.ts';
import type { Plan, PlanCut } from '../files/plan-file.ts';
import { narrowReadingDeg } from '../pattern/beamwidth.ts';
import type { Figure } from '../pattern/figure.ts';
import type { CutLevels } from './cut-levels.ts';
import type { CutFigures, FigureEntry, FiguresDocument, Flag } from './figures-document.ts';

/** Fewer steps across the half-power beam than this, and its width reads narrow by 0.35 % or more. */
const fewestSteps = 12;

/** `figures`: those of the same cut, as the document has them. */
export function cutFlags(plan: Plan, cut: PlanCut, levels: CutLevels, figures: CutFigures): Flag[] {
  const flags: Flag[] = [];
  const flag = (code: string, text: string): void => {
    flags.push({ code, text, cut: cut.name });
  };
  if (levels.because) flag('CUT_INCOMPLETE', `${cut.name}: ${levels.because}`);
  const closureDb = medianDb(levels.closureDb);
  if (closureDb !== undefined && closureDb > plan.checks.closureDb) {
    flag(
      'CLOSURE_LARGE',
      `${cut.name}: the end of the turn differs from its start by ${closureDb.toFixed(2)} dB (median over the band; limit ${plan.checks.closureDb} dB): look for drift, slip or a moved cable`,
    );
  }
  const driftDb = medianDb(levels.driftDb);
  if (driftDb !== undefined && driftDb > plan.checks.driftDb) {
    flag(
      'DRIFT_LARGE',
      `${cut.name}: boresight moved by ${driftDb.toFixed(2)} dB between ties (median over the band; limit ${plan.checks.driftDb} dB)`,
    );
  }
  if (levels.driftRefused) {
    flag('DRIFT_NOT_CORRECTED', `${cut.name}: drift was not corrected: ${levels.driftRefused.because}`);
  }
  const coarse = coarseStep(figures);
  if (coarse) flag('STEP_COARSE', `${cut.name}: ${coarse}`);
  return flags;
}

/** What there is to say of a step too coarse for the beam; undefined where it is fine enough. */
function coarseStep({ anglesDeg, figures }: CutFigures): string | undefined {
  const widthDeg = median((figures.halfPowerBeamwidthDeg ?? []).flatMap(valueOfEntry));
  const stepDeg = median(anglesDeg.slice(1).map((angleDeg, k) => angleDeg - anglesDeg[k]!));
  if (widthDeg === undefined || stepDeg === undefined || widthDeg >= fewestSteps * stepDeg) return undefined;
  const narrowDeg = narrowReadingDeg(widthDeg, stepDeg);
  return (
    `the step of ${rounded(stepDeg)}° is coarse for a half-power beamwidth of ${widthDeg.toFixed(1)}° (median over the band): ` +
    `it may read up to ${narrowDeg.toPrecision(1)}° (${((100 * narrowDeg) / widthDeg).toFixed(1)} %, an estimate) narrow; measure with steps of ${rounded(roundedDown(widthDeg / fewestSteps))}° or less`
  );
}

function valueOfEntry(entry: FigureEntry): number[] {
  return 'absent' in entry || entry.bound ? [] : [entry.value];
}

/** Never upwards: to a tenth of a degree, below that to one digit. */
function roundedDown(stepDeg: number): number {
  const unit = Math.min(0.1, 10 ** Math.floor(Math.log10(stepDeg)));
  return Math.floor(stepDeg / unit + 1e-9) * unit;
}

function rounded(deg: number): number {
  return Number(deg.toPrecision(3));
}

/** `segments`: how many the run has; between two of them it was interrupted. */
export function runFlags(
  setups: readonly SetupRecord[],
  segments: number,
  state: FiguresDocument['state'],
): Flag[] {
  const flags: Flag[] = [];
  if (setups.some((setup) => !setup.calibration.correctionOn)) {
    flags.push({ code: 'CALIBRATION_OFF', text: 'the analyzer measured without its calibration' });
  }
  if (setups.some((setup) => setup.calibration.interpolated)) {
    flags.push({ code: 'CALIBRATION_INTERPOLATED', text: 'the analyzer interpolated its calibration' });
  }
  if (segments > 1) {
    const times = timesInWords(state === 'interrupted' ? segments : segments - 1);
    const end = state === 'complete' ? ' and went on by itself' : '';
    flags.push({ code: 'RUN_INTERRUPTED', text: `the run was interrupted ${times}${end}` });
  }
  return flags;
}

/** What the positions that were taken again after an interruption differ by, where that is more than drift may. */
export function repeatFlags(plan: Plan, events: readonly RunEventRecord[]): Flag[] {
  const limitDb = plan.checks.driftDb;
  return events.flatMap(({ kind, facts }) => {
    const differenceDb = Number(facts['differenceDb']);
    if (kind !== 'repeat' || !(Math.abs(differenceDb) > limitDb)) return [];
    const at = `${String(facts['cut'])} at ${String(facts['angleDeg'])}°`;
    const text = `${at}, taken again after an interruption, differs by ${differenceDb.toFixed(2)} dB (median over the band; limit ${limitDb} dB): look for slip or a moved cable`;
    return [{ code: 'REPEAT_DIFFERS', text, cut: String(facts['cut']) }];
  });
}

function timesInWords(times: number): string {
  return times === 1 ? 'once' : times === 2 ? 'twice' : `${times} times`;
}

function medianDb(figures: readonly Figure[]): number | undefined {
  return median(figures.flatMap((figure) => (figure.kind === 'value' ? [Math.abs(figure.value)] : [])));
}

function median(values: readonly number[]): number | undefined {
  return [...values].sort((a, b) => a - b)[Math.floor(values.length / 2)];
}
