// What tells the two editions of the simulated controller apart, as data: the classic one with three axes
// and a small buffer, the extended one with a rotary axis, a deep queue and habits of its own. Both speak the
// same protocol family; the behaviour itself is in the other files of this folder.

export const axisLetters = ['X', 'Y', 'Z', 'A'] as const;
export type AxisLetter = (typeof axisLetters)[number];

export type Edition = 'classic' | 'extended';

export interface ControllerTraits {
  axisCount: number;
  banner: string;
  versionLines: (userText: string) => string[];
  /** Bytes that wait for the line reader; more are lost without a word. */
  receiveBytes: number;
  /** Free planner blocks of a controller at rest. */
  plannerBlocks: number;
  /** Longest line after spaces and comments are taken out. */
  lineCharacters: number;
  /** A line feed right after a carriage return does not end a second line. */
  joinsCrLf: boolean;
  /** After a refused G-code line each further one gets the same error, until an empty or a `$` line. */
  errorsStick: boolean;
  /** A reset confirms the line that was being executed although it was not done. */
  confirmsAbortedLine: boolean;
  /** How long the device is deaf after it has printed an alarm. */
  alarmSilenceMs: number;
  /** A dwell looks at real-time requests only this often. */
  dwellTickMs: number;
  /** Free blocks and bytes stand in every report, whatever `$10` says. */
  alwaysReportsBuffers: boolean;
  /** Byte values 0x80 to 0x83, 0x87, 0x8C and 0x19 have a meaning. */
  hasExtendedBytes: boolean;
  /** `[MSG:]` precedes what follows a resume. */
  remarksResume: boolean;
  /** Unsupported value words are left over (36) rather than unknown (20). */
  leftOverWords: boolean;
  modeTail: string;
}

export const traitsOf: Record<Edition, ControllerTraits> = {
  classic: {
    axisCount: 3,
    banner: "Grbl 1.1h ['$' for help]",
    versionLines: (userText) => [`[VER:1.1h.20190830:${userText}]`, '[OPT:V,15,128]'],
    receiveBytes: 128,
    plannerBlocks: 15,
    lineCharacters: 79,
    joinsCrLf: false,
    errorsStick: false,
    confirmsAbortedLine: true,
    alarmSilenceMs: 500,
    dwellTickMs: 50,
    alwaysReportsBuffers: false,
    hasExtendedBytes: false,
    remarksResume: false,
    leftOverWords: false,
    modeTail: 'M5 M9 T0',
  },
  extended: {
    axisCount: 4,
    banner: "GrblHAL 1.1f ['$' or '$HELP' for help]",
    versionLines: (userText) => [
      `[VER:1.1f.20260817:${userText}]`,
      '[OPT:VNM,100,1024,4,0]',
      '[AXS:4:XYZA]',
      '[FIRMWARE:grblHAL]',
      '[DRIVER:bench]',
    ],
    receiveBytes: 1024,
    plannerBlocks: 100,
    lineCharacters: 256,
    joinsCrLf: true,
    errorsStick: true,
    confirmsAbortedLine: false,
    alarmSilenceMs: 100,
    dwellTickMs: 10,
    alwaysReportsBuffers: true,
    hasExtendedBytes: true,
    remarksResume: true,
    leftOverWords: true,
    modeTail: 'G40 G49 G98 G50 M5 M9 T0',
  },
};
