// Is there room for the night? The size of what will be stored against what the disk has left.
import type { PlannedRun } from '../expand.ts';
import type { Finding } from './finding.ts';
import { bytesText } from './wording.ts';

/** The disk under the archive; whoever checks has looked before. */
export type DiskState =
  | { kind: 'free'; freeBytes: number; folder: string }
  | { kind: 'no-folder'; folder: string }
  | { kind: 'unknown'; because: string };

/** Of a sample beside its traces: row, track, index and its line in the log, rounded up. */
const besideTracesBytes = 1500;
/** The archive's write-ahead log and the pages of an empty one, rounded up. */
const standingBytes = 16_000_000;
/** Retries, ties of further segments, and a disk that is not used to its last byte. */
const spareFactor = 2;

/** Bytes that the samples of a run take: complex double numbers, 16 bytes a point and trace. */
export function archiveBytes(run: PlannedRun, points: number): number {
  const traces = run.steps.reduce((sum, { purpose }) => {
    return sum + (purpose === 'tie' || purpose === 'reference' ? 2 : 1);
  }, 0);
  return traces * points * 16 + run.steps.length * besideTracesBytes;
}

export function checkDiskSpace(bytes: number, disk: DiskState): Finding {
  const subject = 'disk-space';
  if (disk.kind === 'no-folder') {
    const text = `there is no folder ${disk.folder} for the archive`;
    return { subject, verdict: 'no-go', text, change: 'make the folder, or name another archive', facts: {} };
  }
  if (disk.kind === 'unknown') {
    const text = `the free space could not be read: ${disk.because}`;
    return { subject, verdict: 'not-checked', text, facts: {} };
  }
  const neededBytes = spareFactor * bytes + standingBytes;
  const { freeBytes, folder } = disk;
  const text = `${bytesText(freeBytes)} free in ${folder}; the run stores about ${bytesText(bytes)}, wanted are ${bytesText(neededBytes)}`;
  const facts = { freeBytes, archiveBytes: bytes, neededBytes };
  if (freeBytes >= neededBytes) return { subject, verdict: 'go', text, facts };
  return { subject, verdict: 'no-go', text, change: 'free space, or put the archive on another disk', facts };
}
