// What can go wrong in the daemon, as values with a code; and for every code (the drivers' too) what it
// means, the operator's next step and the exit code. The table is typed over all codes: one without
// advice does not compile. DEVELOPERS.md carries the same table; a gate compares them both ways.
import type { DriverErrorCode, ErrorFacts } from '../drivers/errors.ts';
import { DriverError } from '../drivers/errors.ts';

export const daemonErrorCodes = [
  'USAGE_WRONG',
  'FILE_UNREADABLE',
  'FILE_INVALID',
  'PLAN_OUTSIDE_TRAVEL',
  'PLAN_AXIS_UNKNOWN',
  'REFERENCE_MISSING',
  'REFERENCE_DOES_NOT_FIT',
  'ARCHIVE_UNUSABLE',
  'ARCHIVE_NEWER',
  'ARCHIVE_NO_SUCH_RUN',
  'ARCHIVE_DAMAGED',
  'ARCHIVE_WRITE_FAILED',
  'PATTERN_BAD_INPUT',
  'RUN_INTERRUPTED',
  'RUN_GAVE_UP',
  'RUN_NOT_RESUMABLE',
  'RANGE_HELD',
  'DEFECT',
] as const;

export type DaemonErrorCode = (typeof daemonErrorCodes)[number];
export type ErrorCode = DriverErrorCode | DaemonErrorCode;

export class DaemonError extends Error {
  override readonly name = 'DaemonError';
  readonly code: DaemonErrorCode;
  readonly facts: ErrorFacts;

  constructor(code: DaemonErrorCode, message: string, facts: ErrorFacts = {}, cause?: unknown) {
    super(message, cause === undefined ? undefined : { cause });
    this.code = code;
    this.facts = facts;
  }
}

/** Exit codes that other programs may rely on. */
export const exitCodes = {
  done: 0,
  failed: 1,
  badInput: 2,
  hardware: 3,
  undecided: 4,
  interrupted: 5,
  rangeHeld: 6,
  archive: 7,
  defect: 70,
} as const;

export type ExitCode = (typeof exitCodes)[keyof typeof exitCodes];

export interface Advice {
  /** What is now true, or no longer true. */
  meaning: string;
  /** The operator's next step. */
  nextStep: string;
  exitCode: ExitCode;
}

const { badInput, hardware, interrupted, rangeHeld, archive, defect } = exitCodes;

export const adviceTable: Readonly<Record<ErrorCode, Advice>> = {
  LINK_OPEN_FAILED: {
    meaning: 'Nobody answers at the address of this link.',
    nextStep:
      'Check that the device is on, its cable, and the link in the range file; another program may hold it.',
    exitCode: hardware,
  },
  LINK_CLOSED: {
    meaning: 'The connection to the device was lost.',
    nextStep: 'Check cable and power of the device, then measure again.',
    exitCode: hardware,
  },
  LINK_TIMEOUT: {
    meaning: 'The wire took no more bytes in time.',
    nextStep: 'Check that the device is on and not held by another program.',
    exitCode: hardware,
  },
  ANALYZER_NOT_ANSWERING: {
    meaning: 'The analyzer is connected but leaves a question unanswered.',
    nextStep:
      'Close other programs that talk to it (many analyzers serve one session), or restart the analyzer.',
    exitCode: hardware,
  },
  ANALYZER_IDENTITY_CHANGED: {
    meaning: 'After reconnecting another analyzer answers than before.',
    nextStep: 'Check the address in the range file; a run is measured with one analyzer only.',
    exitCode: hardware,
  },
  ANALYZER_COMMAND_REFUSED: {
    meaning: 'The analyzer does not know a command or refuses its value.',
    nextStep:
      'Compare the dialect in the range file with the analyzer, and the refused value with its limits.',
    exitCode: hardware,
  },
  ANALYZER_SETTING_DIFFERS: {
    meaning: 'The analyzer accepted another value than the plan asks for; nothing was measured with it.',
    nextStep: 'Put a value the analyzer has into the plan.',
    exitCode: hardware,
  },
  ANALYZER_BAD_ANSWER: {
    meaning: 'An answer of the analyzer could not be read; it was not stored.',
    nextStep: 'The bytes are in the log. Look for a second program on the same session or a bad network.',
    exitCode: hardware,
  },
  ANALYZER_BAD_BLOCK: {
    meaning: 'A data block of the analyzer is damaged or of another size; it was not stored.',
    nextStep:
      'The bytes are in the log. Check the trace format in the range file and that nobody works at the front panel.',
    exitCode: hardware,
  },
  ANALYZER_IMPLAUSIBLE_DATA: {
    meaning: 'Traces came that no passive antenna range can give; they were not stored.',
    nextStep:
      'Check the byte order in the range file, the calibration, and that the sweep is really triggered.',
    exitCode: hardware,
  },
  ANALYZER_SWEEP_TIMEOUT: {
    meaning: 'A sweep did not end in the time the analyzer itself states.',
    nextStep: 'Check the trigger source at the analyzer; it must be internal.',
    exitCode: hardware,
  },
  ANALYZER_DEVICE_ERROR: {
    meaning: 'The analyzer reports a fault of its own.',
    nextStep: 'Read its text in the log; a level out of range or a lost lock needs a look at the analyzer.',
    exitCode: hardware,
  },
  ANALYZER_POWER_CYCLED: {
    meaning: 'The analyzer was switched off and on; its settings and perhaps its calibration are gone.',
    nextStep: 'Check its calibration, then measure again.',
    exitCode: hardware,
  },
  ANALYZER_OUT_OF_STEP: {
    meaning: 'Question and answer no longer belong together; the session must be opened anew.',
    nextStep: 'The run does this by itself; if it recurs, look for a second program on the same session.',
    exitCode: hardware,
  },
  ANALYZER_INTERRUPTED: {
    meaning: 'Switching the source off overtook what the analyzer was asked to do.',
    nextStep: 'Nothing is wrong with the analyzer; measure again when it is safe to.',
    exitCode: hardware,
  },
  ANALYZER_BAD_DIALECT: {
    meaning: 'The analyzer dialect lacks a command, or a command of it cannot be filled in safely.',
    nextStep: 'Correct the dialect in the range file; nothing doubtful was sent.',
    exitCode: badInput,
  },
  POSITIONER_NOT_ANSWERING: {
    meaning: 'The motion controller does not answer; it may still finish a move it has.',
    nextStep: 'Stand clear, check its power and cable, then measure again.',
    exitCode: hardware,
  },
  POSITIONER_UNEXPECTED_CONTROLLER: {
    meaning: 'What answers is not a controller of the family named in the range file.',
    nextStep: 'Check link and family in the range file.',
    exitCode: hardware,
  },
  POSITIONER_UNSAFE_SETTING: {
    meaning: 'A setting of the controller would spoil an unattended run.',
    nextStep: 'Change the named setting at the controller, then measure again.',
    exitCode: hardware,
  },
  POSITIONER_BUSY_AT_CONNECT: {
    meaning: 'The controller was moving or held when we connected; somebody else may be using it.',
    nextStep: 'Stand clear, find out who moves it, stop it there, then measure again.',
    exitCode: hardware,
  },
  POSITIONER_COMMAND_REFUSED: {
    meaning: 'The controller refused a line; nothing moved by it.',
    nextStep: 'The refused line and the reason are in the message; compare the axis words in the range file.',
    exitCode: hardware,
  },
  POSITIONER_BAD_ANSWER: {
    meaning: 'A report of the controller could not be read.',
    nextStep:
      'The bytes are in the log. Look for noise on the serial cable (earthing, motor cables beside it).',
    exitCode: hardware,
  },
  POSITIONER_ALARM: {
    meaning:
      'The controller is in alarm and moves no more; the message says whether its position is still true.',
    nextStep: 'Look at the axis before anything else, clear the cause, then measure again.',
    exitCode: hardware,
  },
  POSITIONER_RESTARTED: {
    meaning: 'The controller restarted and has forgotten its position.',
    nextStep:
      'Check its supply. Axes without a home switch: bring them to boresight by hand, set the zero there, and measure with --zero-is-true.',
    exitCode: hardware,
  },
  POSITIONER_REFERENCE_LOST: {
    meaning: 'The position is no longer known; no angle may be trusted.',
    nextStep:
      'Axes without a home switch: bring them to boresight by hand, set the zero of the controller there, and measure with --zero-is-true.',
    exitCode: hardware,
  },
  POSITIONER_HELD: {
    meaning: 'The controller is held or its door is open.',
    nextStep: 'Find out who pressed hold and why, release it there, then measure again.',
    exitCode: hardware,
  },
  POSITIONER_STALLED: {
    meaning: 'An axis was told to move and does not.',
    nextStep: 'Look for a blocked mast, a loose coupling or a missing motor supply.',
    exitCode: hardware,
  },
  POSITIONER_WRONG_PLACE: {
    meaning: 'The axis came to rest elsewhere than asked; nothing was measured there.',
    nextStep: 'Compare units per degree and tolerance in the range file with the controller.',
    exitCode: hardware,
  },
  POSITIONER_OUTSIDE_TRAVEL: {
    meaning: 'A position outside the travel of an axis was asked for; nothing was sent.',
    nextStep: 'Compare the angles of the plan with the travel in the range file.',
    exitCode: badInput,
  },
  POSITIONER_STOPPED: {
    meaning: 'The motion was stopped on request.',
    nextStep: 'Nothing moves. Go on with `nightcut resume` when ready.',
    exitCode: interrupted,
  },
  POSITIONER_STOP_UNCONFIRMED: {
    meaning: 'The controller did not confirm that it stopped. It may be moving.',
    nextStep: 'Use the hardware emergency stop and stand clear.',
    exitCode: hardware,
  },
  USAGE_WRONG: {
    meaning: 'The command line is not understood; nothing was done.',
    nextStep: 'Run the command with --help.',
    exitCode: badInput,
  },
  FILE_UNREADABLE: {
    meaning: 'A file could not be read; nothing was done.',
    nextStep: 'Check the path; the range file is ./range.yaml unless --range names another.',
    exitCode: badInput,
  },
  FILE_INVALID: {
    meaning: 'A file holds something else than expected; nothing was done.',
    nextStep: 'Correct the named line.',
    exitCode: badInput,
  },
  PLAN_OUTSIDE_TRAVEL: {
    meaning: 'The plan needs a position outside the travel of an axis; nothing moved.',
    nextStep: 'Shorten the cut, or correct travel and boresight in the range file.',
    exitCode: badInput,
  },
  PLAN_AXIS_UNKNOWN: {
    meaning: 'The plan names an axis the range does not have; nothing moved.',
    nextStep: 'Use an axis name of the range file.',
    exitCode: badInput,
  },
  REFERENCE_MISSING: {
    meaning: 'The plan takes its gain from a reference run, and the archive has none that is complete.',
    nextStep: 'Measure the reference antenna first, or write `gainReference: none` into the plan.',
    exitCode: badInput,
  },
  REFERENCE_DOES_NOT_FIT: {
    meaning:
      'The gain reference does not fit the plan: other frequencies, other range, or too short a table.',
    nextStep:
      'Measure the reference antenna with the same band and points, under the name of its gain table.',
    exitCode: badInput,
  },
  ARCHIVE_UNUSABLE: {
    meaning: 'The archive cannot be opened.',
    nextStep: 'Check path, permissions and that the file is an archive of ours.',
    exitCode: archive,
  },
  ARCHIVE_NEWER: {
    meaning: 'The archive was written by a newer version.',
    nextStep: 'Use that version, or another archive.',
    exitCode: archive,
  },
  ARCHIVE_NO_SUCH_RUN: {
    meaning: 'The archive has no run of this number.',
    nextStep: 'List the runs with `nightcut runs`.',
    exitCode: badInput,
  },
  ARCHIVE_DAMAGED: {
    meaning: 'A stored sample does not match its checksum.',
    nextStep: 'Check the disk; restore the archive from a backup.',
    exitCode: archive,
  },
  ARCHIVE_WRITE_FAILED: {
    meaning: 'The archive could not store a sample; the run stopped rather than go on without it.',
    nextStep: 'Check free space and permissions, then measure again.',
    exitCode: archive,
  },
  PATTERN_BAD_INPUT: {
    meaning: 'The samples cannot be turned into figures.',
    nextStep: 'The message names the value and the remedy.',
    exitCode: badInput,
  },
  RUN_INTERRUPTED: {
    meaning: 'The run was stopped before its end; what was announced is safe in the archive.',
    nextStep: 'Go on with `nightcut resume` when ready.',
    exitCode: interrupted,
  },
  RUN_GAVE_UP: {
    meaning: 'The same position failed again and again; the run ended safely.',
    nextStep: 'The cause is in the message and in the log; clear it and go on with `nightcut resume`.',
    exitCode: hardware,
  },
  RUN_NOT_RESUMABLE: {
    meaning:
      'There is no run that could go on, or it does not fit the range as it stands now; nothing moved.',
    nextStep: 'List the runs with `nightcut runs`; measure anew where the range has changed.',
    exitCode: badInput,
  },
  RANGE_HELD: {
    meaning: 'Another process drives this device.',
    nextStep: 'Wait for it to end, or stop it, then measure again.',
    exitCode: rangeHeld,
  },
  DEFECT: {
    meaning: 'A defect of ours.',
    nextStep: 'Keep the log and the archive, and report what you did.',
    exitCode: defect,
  },
};

/** The code of any error value; what has none is a defect. */
export function codeOf(error: unknown): ErrorCode {
  if (error instanceof DriverError || error instanceof DaemonError) return error.code;
  if (error instanceof Error && (error as { code?: unknown }).code === 'PATTERN_BAD_INPUT') {
    return 'PATTERN_BAD_INPUT';
  }
  return 'DEFECT';
}

export function adviceOf(error: unknown): Advice {
  return adviceTable[codeOf(error)];
}
