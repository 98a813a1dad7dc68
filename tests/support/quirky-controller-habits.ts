// The quirks of the quirky controller: what each means, and a controller without any. Data only.

export interface ControllerQuirks {
  banner: string;
  /** Lines ahead of the banner, as a bootloader prints them. */
  bootText: readonly string[];
  /** From a reset of the processor to the banner; deaf meanwhile. */
  bootMs: number;
  resetsOnConnect: boolean;
  /** Banners of restarts that nobody asked for never arrive. */
  bannerLost: boolean;
  /** Neither do those of resets that were asked for. */
  resetsSilently: boolean;
  /** Locked after power-up: motion gives error:9. */
  lockedAtStart: boolean;
  lineEnd: '\r\n' | '\n';
  version: string;
  axes: number;
  /** Machine positions, or work positions with their offset now and then. */
  reports: 'machine' | 'work';
  offset: number;
  offsetEvery: number;
  /** Further fields of a report. */
  fields: readonly string[];
  /** The position stands behind the other fields. */
  positionLast: boolean;
  idleWord: string;
  /** `Hold` without a number behind it. */
  plainHold: boolean;
  settingsOrder: 'up' | 'down' | 'mixed';
  settingComments: boolean;
  settings: Readonly<Record<number, string>>;
  /** Remembers and prints the plane, as most do. */
  printsState: boolean;
  /** Share of lines ahead of which a remark comes. */
  remarks: number;
  /** Before each `ok` of a line. */
  okDelayMs: number;
  /** Every n-th `ok` takes `slowOkMs`; 0: none. */
  slowOkEvery: number;
  slowOkMs: number;
  lostReports: number;
  lostOks: number;
  /** Share of lines sent that a byte of noise hits. */
  noise: number;
  noiseBytes: 'unprintable' | 'any';
  homingMs: number;
  homingFails: boolean;
  /** The controller's own travel, both ways, in its units; beyond: alarm 2. */
  softLimit: number;
  feedOverride: number;
  /** Takes no notice of the byte that resets the override. */
  overrideFixed: boolean;
  /** What a soft reset in motion says. */
  resetAlarm: 'in-motion' | 'always' | 'never';
  /** A hold takes effect so much later. */
  holdLateMs: number;
  /** Holds are ignored altogether for so long after a move began. */
  holdDeafMs: number;
  /** Goes to sleep after so long at rest; 0: never. */
  sleepsAfterMs: number;
  /** One refused line makes it refuse all others until an empty or a $ line. */
  stickyErrors: boolean;
}

export const plainController: ControllerQuirks = {
  banner: "Grbl 1.1h ['$' for help]",
  bootText: [],
  bootMs: 25,
  resetsOnConnect: true,
  bannerLost: false,
  resetsSilently: false,
  lockedAtStart: false,
  lineEnd: '\r\n',
  version: '[VER:1.1h.20190830:]',
  axes: 3,
  reports: 'machine',
  offset: 0,
  offsetEvery: 10,
  fields: ['FS:0,0'],
  positionLast: false,
  idleWord: 'Idle',
  plainHold: false,
  settingsOrder: 'up',
  settingComments: false,
  settings: {},
  printsState: true,
  remarks: 0,
  okDelayMs: 3,
  slowOkEvery: 0,
  slowOkMs: 0,
  lostReports: 0,
  lostOks: 0,
  noise: 0,
  noiseBytes: 'unprintable',
  homingMs: 3_000,
  homingFails: false,
  softLimit: Number.POSITIVE_INFINITY,
  feedOverride: 100,
  overrideFixed: false,
  resetAlarm: 'in-motion',
  holdLateMs: 0,
  holdDeafMs: 0,
  sleepsAfterMs: 0,
  stickyErrors: false,
};
