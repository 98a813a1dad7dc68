// The command line as a whole: which commands there are, and how an error becomes a line of text and an
// exit code. Each command group has its own file.
import { Command, CommanderError } from 'commander';
import { adviceOf, codeOf, DaemonError, type ExitCode, exitCodes } from '../errors.ts';
import { addCheckCommand } from './check.ts';
import { addMeasureCommand } from './measure.ts';
import { addResumeCommand } from './resume.ts';
import { addRunsCommands } from './runs.ts';
import type { Finish, Surroundings } from './surroundings.ts';

export const programVersion = '0.1.0';

/** Parses and executes; never throws. */
export async function runCommandLine(args: readonly string[], outside: Surroundings): Promise<ExitCode> {
  let exitCode: ExitCode = exitCodes.done;
  const finish: Finish = (code) => {
    exitCode = code;
  };
  const program = new Command('nightcut')
    .description('Measures antennas: pattern, gain and match, every sample kept.')
    .version(programVersion, '--version')
    .exitOverride()
    .configureOutput({
      writeOut: (text) => outside.stdout.write(text),
      writeErr: () => {},
    });
  addCheckCommand(program, outside, finish);
  addMeasureCommand(program, outside, finish);
  addResumeCommand(program, outside, finish);
  addRunsCommands(program, outside, finish);
  for (const command of program.commands) command.exitOverride().copyInheritedSettings(program);
  try {
    if (args.length === 0) throw new DaemonError('USAGE_WRONG', nothingAsked(program));
    await program.parseAsync([...args], { from: 'user' });
    return exitCode;
  } catch (error) {
    return reportError(error, args, outside);
  }
}

function nothingAsked(program: Command): string {
  const names = program.commands.map((command) => command.name());
  return `say what to do: ${names.join(', ')}; nightcut --help tells more`;
}

function reportError(thrown: unknown, args: readonly string[], outside: Surroundings): ExitCode {
  if (thrown instanceof CommanderError && thrown.exitCode === 0) return exitCodes.done;
  const error =
    thrown instanceof CommanderError
      ? new DaemonError('USAGE_WRONG', thrown.message.replace(/^error: /, ''), {}, thrown)
      : thrown;
  const { nextStep, exitCode } = adviceOf(error);
  const message = error instanceof Error ? error.message : String(error);
  if (args.includes('--json')) {
    const document = { nightcut: 'error/1', code: codeOf(error), message, nextStep };
    outside.stdout.write(`${JSON.stringify(document)}\n`);
  }
  outside.stderr.write(`nightcut: ${oneLine(message)}\n`);
  if (codeOf(error) === 'DEFECT' && error instanceof Error) outside.stderr.write(`${error.stack ?? ''}\n`);
  if (exitCode !== exitCodes.badInput) outside.stderr.write(`${codeOf(error)}: ${nextStep}\n`);
  return exitCode;
}

function oneLine(text: string): string {
  return text.replace(/\s*\r?\n\s*/g, ' ').trim();
}
