// The position-report driver against the simulated controller where the contract does not reach: builds without
// options, damaged lines, restarts that nobody hears of, motors that would go off, switches that are never found.
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { DriverError } from '../../../../drivers/errors.ts';
import { MemoryPort } from '../../../../drivers/link/memory.ts';
import type { AxisSetup, PositionReport } from '../../../../drivers/positioner/positioner.ts';
import { ReportPositioner } from '../../../../drivers/positioner/report-positioner.ts';
import { RealtimeStatusController } from '../../../../mocks/positioner/controller.ts';
import { SimulatedClock } from '../../../../mocks/simulated-clock.ts';
import { type ReportRig, readyReportRig, reportRig, turntable } from '../../../support/report-rig.ts';

const plainBuild = { emergencyParser: false, truePositions: false, chatty: true };
const homedAxis: AxisSetup = { ...turntable, homing: 'switch', travelMinDeg: -390, travelMaxDeg: -2 };
const withSwitch = {
  settings: { 22: 1, 27: 1, 130: 400, 131: 400 },
  mechanics: { X: { switchUnits: 200 } },
};

async function failure({ run }: Pick<ReportRig, 'run'>, work: Promise<unknown>): Promise<DriverError> {
  const outcome = await run(
    work.then(
      () => new Error('it did not fail'),
      (error: unknown) => error,
    ),
  );
  if (outcome instanceof DriverError) return outcome;
  throw outcome;
}

describe('builds without options', () => {
  it('are driven all the same, and say of a motion only its ends', async () => {
    const rig = await readyReportRig(plainBuild);
    const reports: PositionReport[] = [];
    rig.positioner.position$.subscribe((report) => reports.push(report));
    await rig.run(rig.positioner.moveTo({ azimuth: 120 }));
    expect(rig.shaftDeg()).toBeCloseTo(120, 6);
    // `M114 R` says 120 from the start there: no report may have believed it.
    expect(reports.filter((report) => report.moving).map((report) => report.position)).toEqual([
      { azimuth: 0 },
    ]);
    expect(reports.at(-1)).toMatchObject({ moving: false, position: { azimuth: 120 } });
  });

  it('stop at once in mid-move: no barrier stands before the quick stop', async () => {
    const rig = await readyReportRig(plainBuild);
    const moving = failure(rig, rig.positioner.moveTo({ azimuth: 180 }));
    await rig.run(rig.clock.sleep(2_000));
    const atDeg = rig.shaftDeg();
    expect(atDeg).toBeGreaterThan(30);
    const report = await rig.run(rig.positioner.stop());
    expect((await moving).code).toBe('POSITIONER_STOPPED');
    // A line of six bytes takes 0.5 ms, a command 3 ms; at 30°/s nothing else may pass.
    expect(rig.shaftDeg() - atDeg).toBeLessThan(1);
    expect(report.position['azimuth']).toBeCloseTo(rig.shaftDeg(), 0);
    expect(rig.positioner.referenceValid).toBe(false);
  });

  it('stop again where the first quick stop was lost on the wire', async () => {
    const rig = await readyReportRig(plainBuild);
    const moving = failure(rig, rig.positioner.moveTo({ azimuth: 180 }));
    await rig.run(rig.clock.sleep(2_000));
    rig.controller.spoilLines(1);
    await rig.run(rig.positioner.stop());
    await moving;
    expect(rig.shaftDeg()).toBeLessThan(140);
    const before = rig.shaftDeg();
    await rig.run(rig.clock.sleep(2_000));
    expect(rig.shaftDeg()).toBe(before);
  });

  it('sends the barrier of a long move only when the move is about over', async () => {
    const rig = await readyReportRig(plainBuild);
    rig.traffic.length = 0;
    const moving = rig.run(rig.positioner.moveTo({ azimuth: 180 }));
    rig.clock.at(rig.clock.monotonicMs() + 5_000, () => rig.traffic.push('> five seconds later'));
    await moving;
    const begun = rig.traffic.findIndex((line) => line.includes('G1 X180'));
    const later = rig.traffic.indexOf('> five seconds later');
    const barrierAt = rig.traffic.findIndex((line, index) => index > begun && line.includes('M400'));
    expect(begun).toBeGreaterThan(0);
    expect(barrierAt).toBeGreaterThan(later);
  });
});

describe('an arrival', () => {
  it('is none before the barrier: a move may take longer than what was told', async () => {
    // The acceleration is not told, so that the plan is too short; the target is named from the start.
    const rig = await readyReportRig(
      { ...plainBuild, settings: { 120: 5 } },
      {},
      (line) => !line.includes('M201'),
    );
    const startedMs = rig.clock.monotonicMs();
    await rig.run(rig.positioner.moveTo({ azimuth: 120 }));
    // 2·√(120/5) s, against 4.1 s as planned.
    expect(rig.clock.monotonicMs() - startedMs).toBeGreaterThan(9_700);
    expect(rig.shaftDeg()).toBeCloseTo(120, 6);
  });

  it('survives answers that are lost or late, at every line of a move', async () => {
    for (let nth = 0; nth < 16; nth += 1) {
      for (const fault of ['lost', 'late'] as const) {
        const rig = await readyReportRig();
        let answers = 0;
        rig.controller.answered$.subscribe(() => {
          answers += 1;
          if (answers !== nth) return;
          if (fault === 'lost') rig.controller.loseAnswers(1);
          else rig.controller.delayAnswers(1, 2_700);
        });
        await rig.run(rig.positioner.moveTo({ azimuth: 60 }));
        expect(rig.shaftDeg(), `${fault} answer ${nth}`).toBeCloseTo(60, 6);
        await rig.run(rig.positioner.moveTo({ azimuth: 20 }));
        expect(rig.shaftDeg(), `${fault} answer ${nth}`).toBeCloseTo(20, 6);
      }
    }
  });
});

it('never sends a motion outside travel, whatever is asked (invariant 1)', async () => {
  const deg = fc.oneof(
    fc.double({ min: -220, max: 220, noNaN: true }),
    fc.constantFrom(-190, -188, 190, 188),
  );
  const axisArb = fc.record({
    approachFrom: fc.constantFrom('below' as const, 'above' as const),
    approachDeg: fc.constantFrom(0, 2, 30),
    unitsPerDegree: fc.constantFrom(1, -1, 2.77777),
  });
  await fc.assert(
    fc.asyncProperty(
      axisArb,
      fc.array(fc.tuple(deg, fc.boolean()), { maxLength: 5 }),
      async (kind, steps) => {
        const axis = { ...turntable, toleranceDeg: 0.1, rateDegPerS: 200, ...kind };
        const rig = await readyReportRig({}, { axes: [axis] });
        for (const [azimuth, throughApproach] of steps) {
          await rig.run(rig.positioner.moveTo({ azimuth }, { throughApproach })).catch((error: unknown) => {
            if (!(error instanceof DriverError) || error.code !== 'POSITIONER_OUTSIDE_TRAVEL') throw error;
          });
        }
        for (const line of rig.traffic) {
          const units = /^> N\d+ G1 X(-?[\d.]+) F[\d.]+\*\d+$/.exec(line)?.[1];
          if (line.includes(' G1 ')) expect(units, line).toBeDefined();
          if (units === undefined) continue;
          expect(Math.abs(Number(units) / axis.unitsPerDegree)).toBeLessThanOrEqual(190 + 1e-9);
        }
      },
    ),
    { numRuns: 40 },
  );
});

describe('a zero that may be false', () => {
  it('is believed after a restart only when somebody vouches for it', async () => {
    for (const believeZeroAfterRestart of [false, true]) {
      const rig = await readyReportRig({}, { believeZeroAfterRestart });
      await rig.run(rig.positioner.moveTo({ azimuth: 90 }));
      rig.controller.restart();
      await rig.run(rig.clock.sleep(500));
      expect(rig.positioner.referenceValid).toBe(false);
      await rig.run(rig.positioner.home()).catch(() => {});
      expect(rig.positioner.referenceValid).toBe(believeZeroAfterRestart);
    }
  });

  it('is none where the count went on: a link that was cut at rest costs nothing', async () => {
    const rig = await readyReportRig();
    await rig.run(rig.positioner.moveTo({ azimuth: 90 }));
    await rig.run(rig.controller.dropVisitors());
    expect((await failure(rig, rig.positioner.moveTo({ azimuth: 80 }))).code).toBe('LINK_CLOSED');
    await rig.run(rig.positioner.identify());
    await rig.run(rig.positioner.home());
    await rig.run(rig.positioner.moveTo({ azimuth: 80 }));
    expect(rig.shaftDeg()).toBeCloseTo(80, 6);
  });

  it('stays lost after a cut in mid-move that was ended by a stop over a new link', async () => {
    const rig = await readyReportRig();
    const moving = failure(rig, rig.positioner.moveTo({ azimuth: 180 }));
    await rig.run(rig.clock.sleep(2_000));
    await rig.run(rig.controller.dropVisitors());
    expect((await moving).code).toBe('LINK_CLOSED');
    const report = await rig.run(rig.positioner.stop());
    expect(rig.shaftDeg()).toBeLessThan(140);
    expect(Math.abs(rig.shaftDeg() - report.position['azimuth']!)).toBeLessThan(0.5);
    await rig.run(rig.positioner.identify());
    expect((await failure(rig, rig.positioner.home())).code).toBe('POSITIONER_REFERENCE_LOST');
  });
});

describe('lines', () => {
  it.each([false, true])(
    'damaged on their way are sent again (ok after Resend: %s)',
    async (okAfterResend) => {
      const rig = await readyReportRig({ okAfterResend });
      for (const azimuth of [30, 70, 20]) {
        rig.controller.spoilLines(1);
        await rig.run(rig.positioner.moveTo({ azimuth }));
        expect(rig.shaftDeg()).toBeCloseTo(azimuth, 6);
      }
      expect(rig.traffic.filter((line) => line.startsWith('< Resend')).length).toBeGreaterThanOrEqual(3);
    },
  );

  it('damaged each time are given up, before anything moves', async () => {
    const rig = await readyReportRig();
    rig.controller.spoilLines(1_000);
    const error = await failure(rig, rig.positioner.moveTo({ azimuth: 30 }));
    expect(['POSITIONER_COMMAND_REFUSED', 'POSITIONER_NOT_ANSWERING']).toContain(error.code);
    expect(rig.shaftDeg()).toBe(0);
  });

  it('never go to a controller that restarted unheard: its line counter is gone', async () => {
    let isDeaf = false;
    const rig = await readyReportRig({}, {}, () => !isDeaf);
    await rig.run(rig.positioner.moveTo({ azimuth: 90 }));
    isDeaf = true;
    rig.controller.restart();
    await rig.run(rig.clock.sleep(1_000));
    isDeaf = false;
    expect(rig.positioner.referenceValid).toBe(true);
    const error = await failure(rig, rig.positioner.moveTo({ azimuth: 100 }));
    expect(error.code).toBe('POSITIONER_RESTARTED');
    expect(rig.shaftDeg()).toBeCloseTo(90, 6);
    expect((await failure(rig, rig.positioner.home())).code).toBe('POSITIONER_REFERENCE_LOST');
  });
});

describe('an unattended night', () => {
  it('keeps its motors on: the delay that cannot be read is set', async () => {
    const rig = await readyReportRig({ driftUnits: 5 });
    await rig.run(rig.positioner.moveTo({ azimuth: 40 }));
    await rig.run(rig.clock.sleep(600_000));
    expect(rig.shaftDeg()).toBeCloseTo(40, 6);
  });

  it('would be off by the drift with the delay of the factory: the check above can fail', async () => {
    const rig = reportRig({ driftUnits: 5 });
    await rig.run(rig.clock.sleep(121_000));
    expect(rig.shaftDeg()).toBe(5);
  });

  it('notices a target that was clipped without a word', async () => {
    // Told OFF, clipped all the same: nothing but the read-back can tell.
    const rig = await readyReportRig(
      { ...withSwitch, softEnds: true },
      { axes: [homedAxis] },
      (line) => !line.includes('Soft endstops'),
    );
    const error = await failure(rig, rig.positioner.moveTo({ azimuth: -100 }));
    expect(error.code).toBe('POSITIONER_WRONG_PLACE');
  });

  it('is refused where soft ends would clip', async () => {
    const rig = reportRig({ ...withSwitch, softEnds: true }, { axes: [homedAxis] });
    const error = await failure(rig, rig.positioner.identify());
    expect(error).toMatchObject({ code: 'POSITIONER_UNSAFE_SETTING', facts: { setting: 'M211' } });
  });

  it('is refused to an axis that the controller does not have', async () => {
    const rig = reportRig({}, { axes: [{ ...turntable, word: 'A' }] });
    expect((await failure(rig, rig.positioner.identify())).code).toBe('POSITIONER_UNEXPECTED_CONTROLLER');
  });

  it('is refused to a controller of the other family', async () => {
    const clock = new SimulatedClock();
    const controller = new RealtimeStatusController(clock);
    const port = new MemoryPort(clock, 'memory://other', { latencyMs: 1 });
    port.listen((visitor) => controller.connect(visitor));
    const positioner = new ReportPositioner(port.link(), clock, { axes: [turntable] });
    const error = await failure({ run: (work) => clock.run(work) }, positioner.identify());
    expect(error.code).toBe('POSITIONER_UNEXPECTED_CONTROLLER');
    expect(controller.state).toBe('Idle');
  });

  it('is refused where nobody answers', async () => {
    const clock = new SimulatedClock();
    const port = new MemoryPort(clock, 'memory://nobody', { latencyMs: 1 });
    port.listen(() => {});
    const positioner = new ReportPositioner(port.link(), clock, { axes: [turntable] });
    const error = await failure({ run: (work) => clock.run(work) }, positioner.identify());
    expect(error.code).toBe('POSITIONER_NOT_ANSWERING');
  });

  it('waits for a bootloader that swallows everything for two seconds', async () => {
    const rig = await readyReportRig({ onConnect: 'restarts', bootMs: 2_000 });
    await rig.run(rig.positioner.moveTo({ azimuth: 10 }));
    expect(rig.shaftDeg()).toBeCloseTo(10, 6);
  });
});

describe('homing', () => {
  it('that finds no switch is a halt, and only a reset leads out of it', async () => {
    const rig = reportRig({ settings: withSwitch.settings }, { axes: [homedAxis] });
    await rig.run(rig.positioner.identify());
    expect(await failure(rig, rig.positioner.home())).toMatchObject({
      code: 'POSITIONER_ALARM',
      facts: { positionKnown: false, wayOut: 'hardware reset' },
    });
    expect((await failure(rig, rig.positioner.identify())).code).toBe('POSITIONER_ALARM');
    rig.controller.restart();
    await rig.run(rig.positioner.identify());
  });

  it.each([
    ['with', {}],
    ['without', plainBuild],
  ])('is ended by a stop, at the price of a halt, %s an emergency parser', async (_, build) => {
    const rig = reportRig({ ...withSwitch, ...build }, { axes: [homedAxis] });
    await rig.run(rig.positioner.identify());
    const homing = failure(rig, rig.positioner.home());
    await rig.run(rig.clock.sleep(3_000));
    expect(rig.controller.state).toBe('Home');
    const report = await rig.run(rig.positioner.stop());
    expect(rig.controller.state).toBe('Alarm');
    expect(report.haltMs).toBeLessThan(1_000);
    // Whichever was heard first: the stop, or the halt that it caused.
    expect(['POSITIONER_STOPPED', 'POSITIONER_ALARM']).toContain((await homing).code);
    const before = rig.shaftDeg();
    await rig.run(rig.clock.sleep(2_000));
    expect(rig.shaftDeg()).toBe(before);
    expect(rig.positioner.referenceValid).toBe(false);
  });
});
