#!/usr/bin/env node
// Entry of `nightcut-mock`: arguments in, exit code out. What the commands do is in command-line.ts.
import { SystemClock } from '../drivers/clock.ts';
import { runMockCommandLine } from './command-line.ts';

// A reader that has seen enough (`| head`) closes the pipe; that is no failure of ours.
process.stdout.on('error', (error: NodeJS.ErrnoException) => {
  if (error.code !== 'EPIPE') throw error;
  process.exit();
});

process.exitCode = await runMockCommandLine(process.argv.slice(2), {
  clock: new SystemClock(),
  stdin: process.stdin,
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
// A reader of standard input would keep the process alive.
process.stdin.destroy();
