// `nightcut check PLAN`: can this night work? Looks at both files, the archive and the disk, and says go or
// no-go with reasons. No device is asked, nothing is made or moved.
import { existsSync, statSync } from 'node:fs';
import { statfs } from 'node:fs/promises';
import { dirname, resolve } from 'node:path';
import type { Command } from 'commander';
import type { Archive } from '../archive/archive.ts';
import { openArchive } from '../archive/open-archive.ts';
import { adviceOf, DaemonError, exitCodes } from '../errors.ts';
import { loadPlan, loadRangeFile } from '../files/load.ts';
import type { Plan } from '../files/plan-file.ts';
import type { RangeFile } from '../files/range-file.ts';
import type { CheckDocument } from '../plan/preflight/check-document.ts';
import { checkNight } from '../plan/preflight/check-night.ts';
import type { DiskState } from '../plan/preflight/disk-space.ts';
import type { ReferenceState } from '../plan/preflight/gain-source.ts';
import { findGainReference } from '../results/gain-reference.ts';
import type { Finish, Surroundings } from './surroundings.ts';
import { printable, renderDuration, renderTable } from './terminal.ts';

interface CheckOptions {
  range: string;
  archive?: string;
  json?: boolean;
}

export function addCheckCommand(program: Command, outside: Surroundings, finish: Finish): void {
  program
    .command('check')
    .description('can this night work? go or no-go, before anything moves or transmits')
    .argument('<plan>', 'what would be measured, such as yagi.plan.yaml')
    .option('--range <path>', 'what stands on the site', 'range.yaml')
    .option('--archive <path>', 'where runs are kept; the range file names it otherwise')
    .option('--json', 'print the document check/1')
    .action(async (planPath: string, options: CheckOptions) => {
      const range = await loadRangeFile(options.range);
      const plan = await loadPlan(planPath);
      const archivePath = options.archive ? resolve(options.archive) : range.archive;
      const document = checkNight(plan, range, {
        nowWallMs: outside.clock.wallMs(),
        reference: await referenceState(archivePath, plan, range),
        disk: await diskState(dirname(archivePath)),
      });
      outside.stdout.write(options.json ? `${JSON.stringify(document)}\n` : renderCheck(document));
      finish(document.verdict === 'go' ? exitCodes.done : exitCodes.failed);
    });
}

/** Opens the archive only where there is one: a check makes none. */
async function referenceState(path: string, plan: Plan, range: RangeFile): Promise<ReferenceState> {
  if (plan.kind !== 'pattern' || plan.gainReference === 'none') return { kind: 'not-asked' };
  if (!existsSync(path) || statSync(path).size === 0) return { kind: 'no-archive', path };
  try {
    const archive = await openArchive(path);
    try {
      return await foundReference(archive, plan, range);
    } finally {
      await archive.close();
    }
  } catch (error) {
    if (!(error instanceof DaemonError)) throw error;
    return { kind: 'refused', because: error.message, nextStep: adviceOf(error).nextStep };
  }
}

async function foundReference(archive: Archive, plan: Plan, range: RangeFile): Promise<ReferenceState> {
  const reference = await findGainReference(archive, plan, range);
  if (!reference) return { kind: 'not-asked' };
  const run = await archive.run(reference.runNumber);
  return {
    kind: 'found',
    run: run.number,
    antenna: reference.antenna,
    endedWallMs: run.endedWallMs ?? run.startedWallMs,
    rangeLengthM: (run.rangeFile as RangeFile).rangeLengthM,
  };
}

async function diskState(folder: string): Promise<DiskState> {
  if (!existsSync(folder)) return { kind: 'no-folder', folder };
  try {
    const { bavail, bsize } = await statfs(folder);
    return { kind: 'free', freeBytes: bavail * bsize, folder };
  } catch (error) {
    return { kind: 'unknown', because: error instanceof Error ? error.message : String(error) };
  }
}

/** A head with the verdict and what the night would take, then every check with what to change. */
function renderCheck(document: CheckDocument): string {
  const { antenna, range, checks, predicted } = document;
  const count = (verdict: string): number => checks.filter((check) => check.verdict === verdict).length;
  const cautions = count('caution');
  const counts = [
    [count('no-go'), 'no-go'],
    [cautions, cautions === 1 ? 'caution' : 'cautions'],
    [count('not-checked'), 'not checked'],
  ].flatMap(([many, word]) => (many === 0 ? [] : [`${many} ${word}`]));
  const name = printable(`${antenna.name} ${antenna.revision}`.trim());
  const verdict = [document.verdict === 'go' ? 'GO' : 'NO-GO', ...counts].join(', ');
  const head = [`${name} on ${printable(range)}: ${verdict}`];
  if (predicted) {
    const end = localMinute(predicted.endWallMs);
    head.push(
      `${predicted.samples} samples, at least ${renderDuration(predicted.durationMs)}; begun now, it ends about ${end}`,
    );
  }
  const rows = checks.flatMap((check) => {
    const row = [
      check.subject.replace('-', ' '),
      check.verdict.replace('not-checked', 'not checked'),
      printable(check.text),
    ];
    return check.change === undefined ? [row] : [row, ['', '', `change: ${printable(check.change)}`]];
  });
  return `${head.join('\n')}\n\n${renderTable(['check', 'verdict', 'why'], rows)}`;
}

function localMinute(wallMs: number): string {
  return new Intl.DateTimeFormat('sv-SE', { dateStyle: 'short', timeStyle: 'short' }).format(wallMs);
}
