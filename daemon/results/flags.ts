// What a reader of the figures must know before trusting them. Judged by the median over the band: one
// frequency in a null says nothing of the range.
import type { SetupRecord } from '../archive/archive.ts';
import type { Plan, PlanCut } from '../files/plan-file.ts';
import type { Figure } from '../pattern/figure.ts';
import type { CutLevels } from './cut-levels.ts';
import type { Flag } from './figures-document.ts';

export function cutFlags(plan: Plan, cut: PlanCut, levels: CutLevels): Flag[] {
  const flags: Flag[] = [];
  const flag = (code: string, text: string): void => {
    flags.push({ code, text, cut: cut.name });
  };
  if (levels.because) flag('CUT_INCOMPLETE', `${cut.name}: ${levels.because}`);
  const closureDb = medianDb(levels.closureDb);
  if (closureDb !== undefined && closureDb > plan.checks.closureDb) {
    flag(
      'CLOSURE_LARGE',
      `${cut.name}: the end of the turn differs from its start by ${closureDb.toFixed(2)} dB (limit ${plan.checks.closureDb} dB): look for drift, slip or a moved cable`,
    );
  }
  const driftDb = medianDb(levels.driftDb);
  if (driftDb !== undefined && driftDb > plan.checks.driftDb) {
    flag(
      'DRIFT_LARGE',
      `${cut.name}: boresight moved by ${driftDb.toFixed(2)} dB between ties (limit ${plan.checks.driftDb} dB)`,
    );
  }
  if (levels.driftRefused) {
    flag('DRIFT_NOT_CORRECTED', `${cut.name}: drift was not corrected: ${levels.driftRefused.because}`);
  }
  return flags;
}

export function runFlags(setups: readonly SetupRecord[], segments: number): Flag[] {
  const flags: Flag[] = [];
  if (setups.some((setup) => !setup.calibration.correctionOn)) {
    flags.push({ code: 'CALIBRATION_OFF', text: 'the analyzer measured without its calibration' });
  }
  if (setups.some((setup) => setup.calibration.interpolated)) {
    flags.push({ code: 'CALIBRATION_INTERPOLATED', text: 'the analyzer interpolated its calibration' });
  }
  if (segments > 1) {
    flags.push({
      code: 'RUN_INTERRUPTED',
      text: `the run was interrupted ${segments - 1} times and went on by itself`,
    });
  }
  return flags;
}

function medianDb(figures: readonly Figure[]): number | undefined {
  const values = figures
    .flatMap((figure) => (figure.kind === 'value' ? [Math.abs(figure.value)] : []))
    .sort((a, b) => a - b);
  return values[Math.floor(values.length / 2)];
}
