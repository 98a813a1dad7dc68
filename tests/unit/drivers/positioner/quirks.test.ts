// The positioner driver against controllers that nobody has met yet: each habit alone, then any mixture of them.
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { DriverErrorCode } from '../../../../drivers/errors.ts';
import type { ControllerQuirks } from '../../../support/quirky-controller-habits.ts';
import {
  type Move,
  type PositionerJob,
  runPositionerJob,
  type Trouble,
} from '../../../support/quirky-positioner-job.ts';

const withSwitch = { 22: '1' };

/** Habits that cost nothing: every move arrives as if there were none. */
const harmless: Record<string, PositionerJob> = {
  'no quirk': { quirks: {} },
  'the i release': { quirks: { banner: "Grbl 1.1i ['$' for help]", version: '[VER:1.1i.20230101:]' } },
  'the f release': { quirks: { banner: "Grbl 1.1f ['$' for help]", version: '[VER:1.1f.20170801:stage]' } },
  'another firmware': { quirks: { banner: "GrblHAL 1.1f ['$' or '$HELP' for help]" } },
  'a younger firmware': {
    quirks: { banner: "GrblMotion 3.0 [stage '$' for help]", version: '[VER:3.0.1.20240101:]' },
  },
  'no reset on connection': { quirks: { resetsOnConnect: false } },
  'text of a bootloader': { quirks: { bootText: ['boot: v2', 'ets ROM, rst:0x1', 'ok?'], bootMs: 1_800 } },
  'LF line ends': { quirks: { lineEnd: '\n' } },
  'ok behind the report': { quirks: { okDelayMs: 60 } },
  'ok at once': { quirks: { okDelayMs: 0 } },
  'work positions': { quirks: { reports: 'work', offset: 12.5 } },
  'work positions, offset seldom': { quirks: { reports: 'work', offset: -3, offsetEvery: 30 } },
  'one axis': { quirks: { axes: 1 } },
  'six axes': { quirks: { axes: 6 } },
  'many fields': {
    quirks: { fields: ['Bf:15,128', 'Ln:99', 'FS:1200,0', 'Pn:XP', 'Ov:100,100,100', 'A:SF', 'AR', 'A:'] },
  },
  'position last': { quirks: { positionLast: true, fields: ['Bf:15,128', 'F:0'] } },
  'Idle:0': { quirks: { idleWord: 'Idle:0' } },
  'settings from the end': { quirks: { settingsOrder: 'down' } },
  'settings in no order, with remarks': { quirks: { settingsOrder: 'mixed', settingComments: true } },
  'remarks at any time': { quirks: { remarks: 0.5 } },
  'locked at start': { quirks: { lockedAtStart: true } },
  'a slow ok': { quirks: { slowOkEvery: 4, slowOkMs: 1_500 } },
  'a very slow ok': { quirks: { slowOkEvery: 9, slowOkMs: 3_500 } },
  'reports lost': { quirks: { lostReports: 0.05 } },
  'homing by switches': { quirks: { settings: withSwitch }, homing: 'switch' },
  'homing that takes 90 s': { quirks: { settings: withSwitch, homingMs: 90_000 }, homing: 'switch' },
  'override of 10 %': { quirks: { feedOverride: 10 } },
  'override of 10 % that stays': { quirks: { feedOverride: 10, overrideFixed: true } },
  'override of 200 % that stays': { quirks: { feedOverride: 200, overrideFixed: true } },
  'errors that stick': { quirks: { stickyErrors: true } },
  'no parser state': { quirks: { printsState: false } },
};

describe('one habit at a time, none of which may cost an arrival', () => {
  it.each(Object.entries(harmless))('%s', async (_, job) => {
    const { failures, arrivals, stops } = await runPositionerJob(job);
    expect(failures).toEqual([]);
    expect(arrivals).toBe(3);
    expect(stops).toBe(1);
  });
});

const far = (trouble: Trouble): readonly Move[] => [
  { azimuth: 20 },
  { azimuth: 120, trouble },
  { azimuth: 40 },
];

/** Troubles in a move: which errors may come, and how many of the three moves arrive. */
const troubles: Record<string, { job: PositionerJob; codes: DriverErrorCode[]; arrivals: number }> = {
  'a stop': {
    job: { quirks: {}, moves: far({ kind: 'stop', afterMs: 1_000 }) },
    codes: ['POSITIONER_STOPPED'],
    arrivals: 2,
  },
  'a stop, the banner of another firmware': {
    job: {
      quirks: { banner: "GrblMotion 3.0 [stage 3.0.1 '$' for help]" },
      moves: far({ kind: 'stop', afterMs: 1_000 }),
    },
    codes: ['POSITIONER_STOPPED'],
    arrivals: 2,
  },
  'a stop whose banner is lost': {
    job: { quirks: { resetsSilently: true }, moves: far({ kind: 'stop', afterMs: 1_000 }) },
    codes: ['POSITIONER_STOPPED'],
    arrivals: 2,
  },
  'a stop before the first line': {
    job: { quirks: {}, moves: far({ kind: 'stop', afterMs: 1 }) },
    codes: ['POSITIONER_STOPPED'],
    arrivals: 2,
  },
  'a stop while holds are ignored': {
    job: { quirks: { holdDeafMs: 1_300 }, moves: far({ kind: 'stop', afterMs: 1_000 }) },
    codes: ['POSITIONER_STOPPED'],
    arrivals: 2,
  },
  'a stop whose hold comes 300 ms late': {
    job: { quirks: { holdLateMs: 300 }, moves: far({ kind: 'stop', afterMs: 1_000 }) },
    codes: ['POSITIONER_STOPPED'],
    arrivals: 2,
  },
  'a stop with Hold alone': {
    job: { quirks: { plainHold: true }, moves: far({ kind: 'stop', afterMs: 1_000 }) },
    codes: ['POSITIONER_STOPPED'],
    arrivals: 2,
  },
  'a stop whose reset always gives an alarm': {
    job: { quirks: { resetAlarm: 'always' }, homing: 'switch', moves: far({ kind: 'stop', afterMs: 1_000 }) },
    codes: ['POSITIONER_STOPPED', 'POSITIONER_ALARM', 'POSITIONER_UNSAFE_SETTING'],
    arrivals: 0,
  },
  'a stop after the link fell': {
    job: { quirks: { resetsOnConnect: false }, moves: far({ kind: 'drop-and-stop', afterMs: 1_000 }) },
    codes: ['LINK_CLOSED', 'POSITIONER_STOPPED', 'POSITIONER_BUSY_AT_CONNECT', 'POSITIONER_RESTARTED'],
    arrivals: 2,
  },
  'a stop after the link fell, reset by connecting': {
    job: { quirks: {}, moves: far({ kind: 'drop-and-stop', afterMs: 1_000 }) },
    codes: ['LINK_CLOSED', 'POSITIONER_STOPPED', 'POSITIONER_RESTARTED', 'POSITIONER_REFERENCE_LOST'],
    arrivals: 1,
  },
  'a restart': {
    job: { quirks: {}, moves: far({ kind: 'restart', afterMs: 1_000 }) },
    codes: ['POSITIONER_RESTARTED', 'POSITIONER_REFERENCE_LOST'],
    arrivals: 1,
  },
  'a restart whose banner is lost': {
    job: { quirks: { bannerLost: true }, moves: far({ kind: 'restart', afterMs: 1_000 }) },
    codes: ['POSITIONER_RESTARTED', 'POSITIONER_REFERENCE_LOST'],
    arrivals: 1,
  },
  'a restart whose banner is lost, parser state never printed': {
    job: {
      quirks: { bannerLost: true, printsState: false },
      moves: far({ kind: 'restart', afterMs: 1_000 }),
    },
    codes: ['POSITIONER_RESTARTED', 'POSITIONER_REFERENCE_LOST', 'POSITIONER_WRONG_PLACE'],
    arrivals: 1,
  },
  'a restart in the first degree of a move, told by no banner but the lock': {
    job: {
      quirks: { bannerLost: true, lockedAtStart: true },
      moves: [{ azimuth: 0, trouble: { kind: 'restart', afterMs: 18 } }, { azimuth: 0 }],
    },
    codes: ['POSITIONER_ALARM', 'POSITIONER_REFERENCE_LOST'],
    arrivals: 0,
  },
  'a hold pressed': {
    job: { quirks: {}, moves: far({ kind: 'hold', afterMs: 1_000 }) },
    codes: ['POSITIONER_HELD'],
    arrivals: 1,
  },
  'a limit switch': {
    job: { quirks: {}, moves: far({ kind: 'limit', afterMs: 1_000 }) },
    codes: ['POSITIONER_ALARM', 'POSITIONER_REFERENCE_LOST'],
    arrivals: 1,
  },
  'travel of the controller narrower than ours': {
    job: { quirks: { softLimit: 60 }, moves: far({ kind: 'none', afterMs: 1 }) },
    codes: ['POSITIONER_ALARM'],
    arrivals: 2,
  },
  inches: { job: { quirks: { settings: { 13: '1' } } }, codes: ['POSITIONER_UNSAFE_SETTING'], arrivals: 0 },
  'homing that fails': {
    job: { quirks: { settings: withSwitch, homingFails: true }, homing: 'switch' },
    codes: ['POSITIONER_ALARM', 'POSITIONER_RESTARTED'],
    arrivals: 0,
  },
  'a controller that goes to sleep': {
    job: { quirks: { sleepsAfterMs: 100 } },
    codes: [
      'POSITIONER_HELD',
      'POSITIONER_BUSY_AT_CONNECT',
      'POSITIONER_RESTARTED',
      'POSITIONER_COMMAND_REFUSED',
      'POSITIONER_WRONG_PLACE',
    ],
    arrivals: 0,
  },
};

describe('one trouble at a time, said with the fitting code', () => {
  it.each(Object.entries(troubles))('%s', async (name, { job, codes, arrivals }) => {
    const outcome = await runPositionerJob(job);
    const others = outcome.errors.filter((error) => !codes.includes(error.code));
    expect(others.map((error) => `${error.code} ${error.message}`)).toEqual([]);
    expect(outcome.failures, name).not.toEqual([]);
    expect(outcome.arrivals).toBe(arrivals);
  });
});

describe('a restart that nobody heard of', () => {
  it('sends no shaft out of its travel, whenever it comes between the two parts of a move', async () => {
    // From a false zero 98° on, another 100° would lead to 198°; the first part takes 2.65 s at 20°/s.
    for (let afterMs = 2_600; afterMs < 3_000; afterMs += 1) {
      const trouble: Trouble = { kind: 'restart', afterMs };
      await runPositionerJob({
        quirks: { bannerLost: true, bootMs: 1 },
        moves: [{ azimuth: 151 }, { azimuth: 100, trouble }],
      });
    }
  }, 30_000);
});

const quirks: fc.Arbitrary<Partial<ControllerQuirks>> = fc.record(
  {
    banner: fc.constantFrom(
      "Grbl 1.1f ['$' for help]",
      "GrblHAL 1.1f ['$' or '$HELP' for help]",
      "Grbl 1.1i ['$' for help]",
    ),
    bootText: fc.constantFrom([], ['boot'], ['ets', 'rst:0x1 (POWERON_RESET)']),
    bootMs: fc.constantFrom(25, 800, 1_900),
    resetsOnConnect: fc.boolean(),
    lockedAtStart: fc.boolean(),
    lineEnd: fc.constantFrom('\r\n', '\n'),
    axes: fc.constantFrom(1, 2, 3, 4, 6),
    reports: fc.constantFrom('machine', 'work'),
    offset: fc.constantFrom(0, 7.5),
    offsetEvery: fc.constantFrom(1, 10, 30),
    fields: fc.subarray(['Bf:15,128', 'Ln:7', 'FS:0,0', 'Pn:P', 'A:', 'AR:50', 'Ov:100,100,100', 'H:1,3']),
    positionLast: fc.boolean(),
    idleWord: fc.constantFrom('Idle', 'Idle:0'),
    plainHold: fc.boolean(),
    settingsOrder: fc.constantFrom('up', 'down', 'mixed'),
    settingComments: fc.boolean(),
    printsState: fc.boolean(),
    remarks: fc.constantFrom(0, 0.3),
    okDelayMs: fc.constantFrom(0, 3, 40),
    slowOkEvery: fc.constantFrom(0, 5, 11),
    slowOkMs: fc.constantFrom(700, 1_700),
    feedOverride: fc.constantFrom(10, 100, 200),
    overrideFixed: fc.boolean(),
    stickyErrors: fc.boolean(),
  },
  { requiredKeys: [] },
);

const seed = fc.integer({ min: 1, max: 1_000_000 });

describe('any mixture of habits', () => {
  it('costs no arrival as long as none of them does', async () => {
    await fc.assert(
      fc.asyncProperty(fc.record({ quirks, seed }), async (job) => {
        const { failures, arrivals } = await runPositionerJob(job);
        expect(failures).toEqual([]);
        expect(arrivals).toBe(3);
      }),
      { seed: 21, numRuns: 80 },
    );
  });

  it('ends in true arrivals and halts or a typed error whatever happens', async () => {
    const rough: fc.Arbitrary<Partial<ControllerQuirks>> = fc.record(
      {
        bannerLost: fc.boolean(),
        resetsSilently: fc.boolean(),
        slowOkMs: fc.constantFrom(1_700, 3_500, 9_000),
        lostReports: fc.constantFrom(0, 0.05, 0.3),
        lostOks: fc.constantFrom(0, 0.02, 0.1),
        noise: fc.constantFrom(0, 0.01, 0.1),
        noiseBytes: fc.constantFrom('unprintable', 'any'),
        softLimit: fc.constantFrom(1_000, 60),
        resetAlarm: fc.constantFrom('in-motion', 'always', 'never'),
        holdLateMs: fc.constantFrom(0, 300),
        holdDeafMs: fc.constantFrom(0, 300, 1_300),
        sleepsAfterMs: fc.constantFrom(0, 0, 30_000),
        homingMs: fc.constantFrom(2_000, 90_000),
        homingFails: fc.constantFrom(false, false, true),
        settings: fc.constantFrom({}, withSwitch, withSwitch),
      },
      { requiredKeys: [] },
    );
    const trouble: fc.Arbitrary<Trouble> = fc.record({
      kind: fc.constantFrom('none', 'none', 'stop', 'restart', 'drop-link', 'drop-and-stop', 'hold', 'limit'),
      afterMs: fc.integer({ min: 0, max: 9_000 }),
    });
    const moves = fc.array(fc.record({ azimuth: fc.integer({ min: -180, max: 180 }), trouble }), {
      minLength: 2,
      maxLength: 5,
    });
    const jobs: fc.Arbitrary<PositionerJob> = fc.record({
      quirks: fc.tuple(quirks, rough).map(([a, b]) => ({ ...a, ...b })),
      seed,
      homing: fc.constantFrom('none', 'switch'),
      moves,
    });
    await fc.assert(
      fc.asyncProperty(jobs, async (job) => {
        await runPositionerJob(job);
      }),
      { seed: 22, numRuns: 150 },
    );
  });
});
