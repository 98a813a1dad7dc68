#!/usr/bin/env node
// Entry of `nightcut`: arguments in, exit code out. What each command does is in cli/.
import { SystemClock } from '../drivers/clock.ts';
import { runCommandLine } from './cli/command-line.ts';

// A reader that has seen enough (`| head`) closes the pipe; that is no failure of ours.
process.stdout.on('error', (error: NodeJS.ErrnoException) => {
  if (error.code !== 'EPIPE') throw error;
  process.exit();
});

process.exitCode = await runCommandLine(process.argv.slice(2), {
  clock: new SystemClock(),
  stdout: process.stdout,
  stderr: process.stderr,
  onStopSignal: (stop) => {
    process.on('SIGINT', stop);
    process.on('SIGTERM', stop);
    return () => {
      process.off('SIGINT', stop);
      process.off('SIGTERM', stop);
    };
  },
});
