// What a command touches of the outside: time, terminal, signals. Handed in, so that commands run
// in tests without a process of their own.
import type { Clock } from '../../drivers/clock.ts';
import type { ExitCode } from '../errors.ts';

export interface TextSink {
  write(text: string): unknown;
  readonly isTTY?: boolean;
  readonly columns?: number;
}

export interface Surroundings {
  clock: Clock;
  /** Results. */
  stdout: TextSink;
  /** Progress, warnings, errors. */
  stderr: TextSink;
  /** Calls `stop` when the operator or the system asks to stop; returns how to take that back. */
  onStopSignal: (stop: () => void) => () => void;
}

/** A command ends by saying its exit code. */
export type Finish = (code: ExitCode) => void;
