// The written files from disk as checked values. The only file here besides read-text.ts that knows disks.
import { parsePlan } from './parse-plan.ts';
import { parseRangeFile } from './parse-range-file.ts';
import type { Plan } from './plan-file.ts';
import type { RangeFile } from './range-file.ts';
import { readText } from './read-text.ts';

/** Throws FILE_UNREADABLE or FILE_INVALID. `path` as the operator wrote it: messages show it so. */
export async function loadRangeFile(path: string): Promise<RangeFile> {
  return parseRangeFile(await readText(path, 'name the range file with --range PATH'), path);
}

/** Throws FILE_UNREADABLE or FILE_INVALID. `path` as the operator wrote it: messages show it so. */
export async function loadPlan(path: string): Promise<Plan> {
  return parsePlan(await readText(path, 'name an existing plan'), path);
}
