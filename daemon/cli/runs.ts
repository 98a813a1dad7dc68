// `nightcut runs` and `nightcut show RUN`: what the archive holds, and the figures of one run.
import { existsSync } from 'node:fs';
import { resolve } from 'node:path';
import type { Command } from 'commander';
import type { Archive } from '../archive/archive.ts';
import { openArchive } from '../archive/open-archive.ts';
import { DaemonError } from '../errors.ts';
import { loadRangeFile } from '../files/load.ts';
import { runFigures } from '../results/run-figures.ts';
import { renderFigures } from './figures-text.ts';
import type { Finish, Surroundings } from './surroundings.ts';
import { printable, renderTable } from './terminal.ts';

interface ArchiveOptions {
  range: string;
  archive?: string;
  json?: boolean;
}

interface ShowOptions extends ArchiveOptions {
  levels?: boolean;
}

export function addRunsCommands(program: Command, outside: Surroundings, _finish: Finish): void {
  withArchive(program.command('runs').description('list the runs of the archive, newest first')).action(
    (options: ArchiveOptions) => onArchive(options, (archive) => printRuns(archive, options, outside)),
  );
  withArchive(
    program
      .command('show')
      .description('figures of one run')
      .argument('<run>', 'number of the run, as `runs` lists it', runNumber)
      .option('--levels', 'with --json: also the level at every angle, for plots'),
  ).action((run: number, options: ShowOptions) => {
    if (options.levels && !options.json) {
      throw new DaemonError('USAGE_WRONG', '--levels goes with --json: levels are for other programs');
    }
    return onArchive(options, (archive) =>
      printRun(archive, run, { json: options.json ?? false, levels: options.levels ?? false }, outside),
    );
  });
}

function withArchive(command: Command): Command {
  return command
    .option('--range <path>', 'the range file that names the archive', 'range.yaml')
    .option('--archive <path>', 'the archive itself')
    .option('--json', 'print one JSON document');
}

async function onArchive(options: ArchiveOptions, act: (archive: Archive) => Promise<void>): Promise<void> {
  const path = options.archive ? resolve(options.archive) : (await loadRangeFile(options.range)).archive;
  // Reading must not create an archive where there is none.
  if (!existsSync(path)) {
    throw new DaemonError(
      'FILE_UNREADABLE',
      `${path}: there is no archive here; name one with --archive, or the range file that does with --range`,
      { path },
    );
  }
  const archive = await openArchive(path);
  try {
    await act(archive);
  } finally {
    await archive.close();
  }
}

async function printRuns(archive: Archive, options: ArchiveOptions, outside: Surroundings): Promise<void> {
  const runs = await archive.runs();
  if (options.json) {
    outside.stdout.write(`${JSON.stringify({ nightcut: 'runs/1', runs })}\n`);
    return;
  }
  if (runs.length === 0) {
    outside.stdout.write('no runs yet\n');
    return;
  }
  const rows = runs.map((run) => [
    String(run.number),
    run.kind,
    printable(`${run.antenna.name} ${run.antenna.revision}`.trim()),
    run.state,
    String(run.samples),
    isoMinute(run.startedWallMs),
  ]);
  outside.stdout.write(renderTable(['run', 'kind', 'antenna', 'state', 'samples', 'started'], rows));
}

/** Prints the figures of one run as text for people or as the document `figures/1`. */
export async function printRun(
  archive: Archive,
  run: number,
  options: { json: boolean; levels?: boolean },
  outside: Surroundings,
): Promise<void> {
  const document = await runFigures(archive, run, { levels: options.levels ?? false });
  outside.stdout.write(options.json ? `${JSON.stringify(document)}\n` : renderFigures(document));
}

export function runNumber(text: string): number {
  if (!/^[1-9]\d{0,8}$/.test(text)) {
    throw new DaemonError('USAGE_WRONG', `expected the number of a run, such as 3; found '${text}'`);
  }
  return Number(text);
}

function isoMinute(wallMs: number): string {
  return new Intl.DateTimeFormat('sv-SE', { dateStyle: 'short', timeStyle: 'short' }).format(wallMs);
}
