// Can this night work? All checks of one plan on one range, and what follows from them. Pure: what the archive
// holds and the disk has left is handed in, no device is asked.
import type { Plan } from '../../files/plan-file.ts';
import type { RangeFile } from '../../files/range-file.ts';
import { checkAngularStep } from './angular-step.ts';
import type { CheckDocument } from './check-document.ts';
import { archiveBytes, checkDiskSpace, type DiskState } from './disk-space.ts';
import { checkFarField } from './far-field.ts';
import type { Finding } from './finding.ts';
import { checkFrequencyGrid } from './frequency-grid.ts';
import { checkGainSource, type ReferenceState } from './gain-source.ts';
import { checkLinkBudget } from './link-budget.ts';
import { checkDuration, nightLength } from './night-length.ts';
import { checkRadiatedPower } from './radiated-power.ts';
import { checkGroundBounce, checkWallEcho } from './reflections.ts';
import { checkTravel } from './travel.ts';

/** What the files do not tell. */
export interface Circumstances {
  nowWallMs: number;
  reference: ReferenceState;
  disk: DiskState;
}

/** One no-go makes the night a no-go; cautions and what was not checked do not. */
export function checkNight(plan: Plan, range: RangeFile, now: Circumstances): CheckDocument {
  const { finding: travel, run } = checkTravel(plan, range);
  const length = run && nightLength(run, plan, range, now.nowWallMs);
  const bytes = run && archiveBytes(run, plan.band.points);
  const checks: Finding[] = [
    checkFarField(plan, range),
    checkLinkBudget(plan, range),
    checkAngularStep(plan, range),
    checkGroundBounce(plan, range),
    checkWallEcho(plan, range),
    checkFrequencyGrid(plan, range),
    travel,
    ...(length ? [checkDuration(length)] : []),
    checkRadiatedPower(plan, range),
    checkGainSource(plan, range, now.reference, now.nowWallMs),
    ...(bytes === undefined ? [] : [checkDiskSpace(bytes, now.disk)]),
  ];
  return {
    nightcut: 'check/1',
    verdict: checks.some((check) => check.verdict === 'no-go') ? 'no-go' : 'go',
    antenna: plan.antenna,
    range: range.name,
    checkedWallMs: now.nowWallMs,
    ...(run && length && bytes !== undefined
      ? { predicted: { samples: run.steps.length, ...length, archiveBytes: bytes } }
      : {}),
    checks,
  };
}
