import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { isDriverError } from '../../../../drivers/errors.ts';
import type { PositionReport } from '../../../../drivers/positioner/positioner.ts';
import { reachableDeg } from '../../../../drivers/positioner/travel.ts';
import {
  azimuth,
  codeOf,
  elevation,
  failureOf,
  makeReadyRig,
  motionTargets,
} from '../../../support/positioner-rig.ts';

describe('moveTo', () => {
  it('arrives, reads back after the barrier, settles, and publishes the way there', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    const reports: PositionReport[] = [];
    positioner.position$.subscribe((report) => reports.push(report));
    const before = clock.monotonicMs();
    const arrival = await clock.run(positioner.moveTo({ azimuth: 90 }));
    expect(arrival.position['azimuth']).toBe(90);
    expect(controller.moving).toBe(false);
    // 90° at 20°/s last 4.5 s; then 300 ms of settling.
    expect(arrival.settledMonotonicMs - before).toBeGreaterThan(4_800);
    expect(arrival.settledMonotonicMs - before).toBeLessThan(5_400);
    const moving = reports.filter((report) => report.moving);
    expect(moving.length).toBeGreaterThan(4.5 * 3);
    expect(moving.length).toBeLessThanOrEqual(4.5 * 10);
    const queries = controller.urgent.filter(({ byte }) => byte === 0x3f).map(({ ms }) => ms);
    expect(controller.lines.slice(-2)).toEqual(['G4 P0.01', '$G']);
    expect(queries.at(-1)! - before).toBeGreaterThan(4_500);
  });

  it('is not fooled by Idle: neither by one before the motion starts nor by one during the dwell', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    const spoil = (text: string): string => text.replace(/^<Run/, '<Idle');
    // The first reports after the line claim rest, as a question close to the line is answered.
    let left = 3;
    controller.spoil = (text) => (text.startsWith('<Run') && left-- > 0 ? spoil(text) : text);
    const arrival = await clock.run(positioner.moveTo({ azimuth: 40 }));
    expect(arrival.position['azimuth']).toBe(40);
    expect(controller.moving).toBe(false);
  });

  it('comes from the approach side, once there is play to take up', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    await clock.run(positioner.moveTo({ azimuth: 90 }));
    await clock.run(positioner.moveTo({ azimuth: 91 }));
    await clock.run(positioner.moveTo({ azimuth: 50 }));
    await clock.run(positioner.moveTo({ azimuth: 50 }));
    await clock.run(positioner.moveTo({ azimuth: 50 }, { throughApproach: true }));
    const xs = motionTargets(controller.lines).map((target) => target['X']);
    expect(xs).toEqual([90, 91, 48, 50, 48, 50]);
  });

  it('counts a place between two steps as reached', async () => {
    const { clock, positioner } = await makeReadyRig();
    const arrival = await clock.run(positioner.moveTo({ azimuth: 33.3333 }));
    // 80 steps per degree: 2667 steps.
    expect(arrival.position['azimuth']).toBe(33.337);
  });

  it('turns the sense and the scale of an axis', async () => {
    const axis = { ...azimuth, unitsPerDegree: -2, rateDegPerS: 10, approachDeg: 0 };
    const { clock, controller, positioner } = await makeReadyRig({}, { axes: [axis] });
    const arrival = await clock.run(positioner.moveTo({ azimuth: 30 }));
    expect(motionTargets(controller.lines)).toEqual([{ X: -60 }]);
    expect(arrival.position).toEqual({ azimuth: 30 });
  });

  it.each([
    [{ azimuth: 190.01 }],
    [{ azimuth: -189 }],
    [{ elevation: 89 }],
    [{ roll: 0 }],
    [{ azimuth: 0, elevation: Number.POSITIVE_INFINITY }],
  ])('refuses %j before any byte', async (target) => {
    const { clock, controller, positioner } = await makeReadyRig();
    const sent = controller.lines.length + controller.urgent.length;
    expect(await codeOf(clock, positioner.moveTo(target))).toBe('POSITIONER_OUTSIDE_TRAVEL');
    expect(controller.lines.length + controller.urgent.length).toBe(sent);
    expect(positioner.referenceValid).toBe(true);
  });

  it('never sends a motion outside travel, whatever is asked (invariant 1)', async () => {
    const axisArb = fc.record({
      approachFrom: fc.constantFrom('below' as const, 'above' as const),
      approachDeg: fc.constantFrom(0, 0.5, 3, 30),
      unitsPerDegree: fc.constantFrom(1, -1, 2.77777, -0.3),
      travelMinDeg: fc.double({ min: -200, max: -20, noNaN: true }),
      travelMaxDeg: fc.double({ min: 20, max: 200, noNaN: true }),
    });
    const deg = fc.oneof(
      fc.double({ min: -220, max: 220, noNaN: true }),
      fc.constantFrom(-200, -20, 0, 20, 200),
    );
    const target = fc.record({ azimuth: deg, elevation: deg }, { requiredKeys: [] });
    const edge = fc.constantFrom('min', 'max', 'free');
    const step = fc.tuple(target, edge, fc.boolean());
    await fc.assert(
      fc.asyncProperty(axisArb, axisArb, fc.array(step, { maxLength: 6 }), async (first, second, steps) => {
        const axes = [
          { ...azimuth, toleranceDeg: 0.1, settleMs: 0, rateDegPerS: 200, ...first },
          { ...elevation, toleranceDeg: 0.1, settleMs: 0, rateDegPerS: 200, ...second },
        ];
        const { clock, controller, positioner } = await makeReadyRig({}, { axes });
        for (const [wish, where, throughApproach] of steps) {
          const { minDeg, maxDeg } = reachableDeg(axes[0]!);
          const asked = where === 'free' ? wish : { ...wish, azimuth: where === 'min' ? minDeg : maxDeg };
          await clock.run(positioner.moveTo(asked, { throughApproach })).catch((error: unknown) => {
            if (!isDriverError(error, 'POSITIONER_OUTSIDE_TRAVEL')) throw error;
          });
        }
        for (const sent of motionTargets(controller.lines)) {
          for (const axis of axes) {
            const units = sent[axis.word];
            if (units === undefined) continue;
            expect(units / axis.unitsPerDegree).toBeGreaterThanOrEqual(axis.travelMinDeg - 1e-9);
            expect(units / axis.unitsPerDegree).toBeLessThanOrEqual(axis.travelMaxDeg + 1e-9);
          }
        }
      }),
      { numRuns: 40 },
    );
  });

  it('refuses while the reference is not valid, and while somebody holds the machine', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    controller.press('!');
    expect(await codeOf(clock, positioner.moveTo({ azimuth: 10 }))).toBe('POSITIONER_HELD');
    controller.press('~');
    controller.alarm(4);
    await clock.run(clock.sleep(50));
    expect(await codeOf(clock, positioner.moveTo({ azimuth: 10 }))).toBe('POSITIONER_ALARM');
    controller.alarm(1);
    await clock.run(clock.sleep(50));
    expect(await codeOf(clock, positioner.moveTo({ azimuth: 10 }))).toBe('POSITIONER_REFERENCE_LOST');
    expect(motionTargets(controller.lines)).toEqual([]);
  });

  it('says wrong place when the axis did not get there', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    const moving = positioner.moveTo({ azimuth: 10 });
    controller.spoil = (text) => text.replace('Idle|MPos:10.000', 'Idle|MPos:9.900');
    const failure = await failureOf(clock, moving);
    expect(failure).toMatchObject({
      code: 'POSITIONER_WRONG_PLACE',
      facts: { axis: 'azimuth', targetDeg: 10, readBackDeg: 9.9 },
    });
  });

  it('reads once more when a single report is damaged into another valid one', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    let damaged = 0;
    controller.spoil = (text) =>
      text.startsWith('<Idle|MPos:10.000') && damaged++ === 0 ? text.replace('10.000', '18.000') : text;
    const arrival = await clock.run(positioner.moveTo({ azimuth: 10 }));
    expect(arrival.position['azimuth']).toBe(10);
    expect(damaged).toBeGreaterThan(1);
  });

  it('stops an axis that leaves its path', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    // A damaged line sends it the other way.
    controller.answerInstead = () => undefined;
    const moving = failureOf(clock, positioner.moveTo({ azimuth: 30 }));
    controller.spoil = (text) => text.replace(/MPos:(\d)/, 'MPos:-$1');
    clock.at(clock.monotonicMs() + 1_500, () => {
      controller.spoil = (text) => text;
    });
    expect((await moving)?.code).toBe('POSITIONER_WRONG_PLACE');
    expect(controller.moving).toBe(false);
    expect(controller.urgent.some(({ byte }) => byte === 0x21)).toBe(true);
  });

  it('finds a motor that makes no progress, and stops it', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    const begun = clock.monotonicMs();
    const moving = failureOf(clock, positioner.moveTo({ azimuth: 100 }));
    clock.at(begun + 1_000, () => controller.stallMotor());
    expect((await moving)?.code).toBe('POSITIONER_STALLED');
    expect(clock.monotonicMs() - begun).toBeLessThan(10_000);
    expect(controller.state).toBe('Idle');
  });

  it('tells of a hold pressed at the machine, leaves it in place, and goes on when it is released', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    const moving = failureOf(clock, positioner.moveTo({ azimuth: 60 }));
    clock.at(clock.monotonicMs() + 1_000, () => controller.press('!'));
    expect((await moving)?.code).toBe('POSITIONER_HELD');
    await clock.run(clock.sleep(500));
    expect(controller.state).toBe('Hold:0');
    expect(controller.urgent.map(({ byte }) => byte)).not.toContain(0x18);
    expect(await codeOf(clock, positioner.moveTo({ azimuth: 20 }))).toBe('POSITIONER_HELD');
    controller.press('~');
    const arrival = await clock.run(positioner.moveTo({ azimuth: 20 }));
    expect(arrival.position['azimuth']).toBe(20);
    expect(positioner.referenceValid).toBe(true);
  });

  it('stops what its own signal has cancelled', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    const cancelled = new AbortController();
    const why = new Error('cancelled by the test');
    clock.at(clock.monotonicMs() + 1_000, () => cancelled.abort(why));
    const moving = clock.run(positioner.moveTo({ azimuth: 60 }, { signal: cancelled.signal }));
    await expect(moving).rejects.toBe(why);
    expect(controller.moving).toBe(false);
    expect(controller.state).toBe('Idle');
    expect(positioner.referenceValid).toBe(true);
  });
});

describe('answers that get lost', () => {
  it.each([
    ['of the motion line', (line: string) => /G1 /.test(line)],
    ['of the barrier', (line: string) => line.startsWith('G4')],
  ])('the ok %s: the same move is sent again and ends in its place', async (_what, isIt) => {
    const { clock, controller, positioner } = await makeReadyRig();
    let lost = 0;
    controller.spoil = (text) => {
      if (text !== 'ok' || lost > 0 || !isIt(controller.lines.at(-1) ?? '')) return text;
      lost += 1;
      return 'o\u00ff';
    };
    const arrival = await clock.run(positioner.moveTo({ azimuth: 60 }));
    expect(lost).toBe(1);
    expect(arrival.position['azimuth']).toBe(60);
    expect(controller.moving).toBe(false);
    // In step again: the next one works at once.
    expect((await clock.run(positioner.moveTo({ azimuth: 61 }))).position['azimuth']).toBe(61);
  });

  it('a late ok is not taken for the answer to the next line', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    let held: string | undefined;
    controller.spoil = (text) => {
      if (text === 'ok' && held === undefined && /G1 /.test(controller.lines.at(-1) ?? '')) {
        held = text;
        clock.at(clock.monotonicMs() + 2_900, () => controller.sayRaw([0x6f, 0x6b, 0x0d, 0x0a]));
        return undefined;
      }
      return text;
    };
    const arrival = await clock.run(positioner.moveTo({ azimuth: 100 }));
    expect(arrival.position['azimuth']).toBe(100);
    expect(controller.moving).toBe(false);
  });

  it('a controller that falls silent in a move is said to be so, and the stop is not claimed', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    const moving = failureOf(clock, positioner.moveTo({ azimuth: 100 }));
    clock.at(clock.monotonicMs() + 1_000, () => {
      controller.spoil = () => undefined;
    });
    const failure = await moving;
    expect(failure?.code).toBe('POSITIONER_STOP_UNCONFIRMED');
    expect(isDriverError(failure?.cause, 'POSITIONER_NOT_ANSWERING')).toBe(true);
    expect(controller.urgent.map(({ byte }) => byte)).toContain(0x21);
  });

  it('noise on the wire is no answer', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    const moving = clock.run(positioner.moveTo({ azimuth: 30 }));
    for (let ms = 100; ms < 1_500; ms += 100)
      clock.at(clock.monotonicMs() + ms, () =>
        controller.sayRaw([0xff, 0x00, 0x3c, 0x4f, 0x0a, 0x6f, 0x0a, 0xfe]),
      );
    expect((await moving).position['azimuth']).toBe(30);
  });

  it('a line that is refused is said to be refused, with the reason', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    controller.answerInstead = (line) => (line.includes('G1 ') ? ['error:20'] : undefined);
    const failure = await failureOf(clock, positioner.moveTo({ azimuth: 30 }));
    expect(failure).toMatchObject({ code: 'POSITIONER_COMMAND_REFUSED', facts: { error: 20 } });
    expect(controller.state).toBe('Idle');
  });
});

describe('restarts and alarms', () => {
  it('a restart in a move ends it; a switch makes the position true again', async () => {
    const axes = [{ ...azimuth, homing: 'switch' as const }];
    const { clock, controller, positioner } = await makeReadyRig({ homedAt: [-1, -1, -1] }, { axes });
    const moving = codeOf(clock, positioner.moveTo({ azimuth: 60 }));
    clock.at(clock.monotonicMs() + 1_000, () => controller.powerCycle());
    expect(await moving).toBe('POSITIONER_RESTARTED');
    expect(positioner.referenceValid).toBe(false);
    expect(await codeOf(clock, positioner.moveTo({ azimuth: 60 }))).toBe('POSITIONER_RESTARTED');
    expect(await codeOf(clock, positioner.readPosition())).toBe('POSITIONER_RESTARTED');
    await clock.run(positioner.home());
    expect(positioner.referenceValid).toBe(true);
    expect((await clock.run(positioner.moveTo({ azimuth: 60 }))).position['azimuth']).toBe(60);
  });

  it('a restart between moves is told by the next call', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    controller.powerCycle();
    await clock.run(clock.sleep(100));
    expect(await codeOf(clock, positioner.moveTo({ azimuth: 60 }))).toBe('POSITIONER_RESTARTED');
  });

  it('an axis without a switch is believed after a restart only where it last stood', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    controller.powerCycle();
    await clock.run(clock.sleep(100));
    await clock.run(positioner.home());
    await clock.run(positioner.moveTo({ azimuth: 60 }));
    controller.powerCycle();
    await clock.run(clock.sleep(100));
    expect(await codeOf(clock, positioner.home())).toBe('POSITIONER_REFERENCE_LOST');
    expect(positioner.referenceValid).toBe(false);
  });

  it('unless the range says to believe its new zero', async () => {
    const { clock, controller, positioner } = await makeReadyRig({}, { believeZeroAfterRestart: true });
    await clock.run(positioner.moveTo({ azimuth: 60 }));
    controller.powerCycle();
    await clock.run(clock.sleep(100));
    await clock.run(positioner.home());
    expect(positioner.referenceValid).toBe(true);
  });

  it.each([
    ['at rest', 0],
    ['in a move away from zero', 2_500],
  ])('a restart whose banner was lost shows by the position: %s', async (_when, afterMs) => {
    const { clock, controller, positioner } = await makeReadyRig();
    await clock.run(positioner.moveTo({ azimuth: 60 }));
    if (afterMs === 0) controller.powerCycle(10, '', false);
    else clock.at(clock.monotonicMs() + afterMs, () => controller.powerCycle(10, '', false));
    await clock.run(clock.sleep(50));
    expect(await codeOf(clock, positioner.moveTo({ azimuth: 150 }))).toBe('POSITIONER_RESTARTED');
    expect(positioner.referenceValid).toBe(false);
  });

  it('a restart on the way to zero, its banner lost, shows by the forgotten modes', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    await clock.run(positioner.moveTo({ azimuth: -60 }));
    // At −12° and 2.5 s before the end of the way: zero is a place on the path.
    clock.at(clock.monotonicMs() + 2_500, () => controller.powerCycle(10, '', false));
    expect(await codeOf(clock, positioner.moveTo({ azimuth: 0 }))).toBe('POSITIONER_RESTARTED');
  });

  it('a limit switch in a move: alarm, mute until reset, position gone', async () => {
    const axes = [{ ...azimuth, homing: 'switch' as const }];
    const { clock, controller, positioner } = await makeReadyRig({ homedAt: [-1, -1, -1] }, { axes });
    const moving = failureOf(clock, positioner.moveTo({ azimuth: 60 }));
    clock.at(clock.monotonicMs() + 1_000, () => controller.alarm(1, true));
    expect(await moving).toMatchObject({
      code: 'POSITIONER_ALARM',
      facts: { alarm: 1, positionKnown: false },
    });
    expect(positioner.referenceValid).toBe(false);
    await clock.run(positioner.home());
    expect(positioner.referenceValid).toBe(true);
    expect(controller.urgent.filter(({ byte }) => byte === 0x18)).toHaveLength(1);
  });

  it("the controller's own soft limit leaves the reference valid", async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    const moving = failureOf(clock, positioner.moveTo({ azimuth: 60 }));
    clock.at(clock.monotonicMs() + 1_000, () => controller.alarm(2, true));
    expect((await moving)?.facts).toMatchObject({ alarm: 2, positionKnown: true });
    expect(positioner.referenceValid).toBe(true);
  });

  it('a homing that fails is not taken for a good one by its false ok', async () => {
    const axes = [{ ...azimuth, homing: 'switch' as const }];
    const { clock, controller, positioner } = await makeReadyRig({ homedAt: [-1, -1, -1] }, { axes });
    controller.answerInstead = (line) => {
      if (line !== '$H') return undefined;
      controller.alarm(9);
      return ['ok', '', "Grbl 1.1h ['$' for help]", "[MSG:'$H'|'$X' to unlock]"];
    };
    expect(await codeOf(clock, positioner.home())).toBe('POSITIONER_ALARM');
    expect(positioner.referenceValid).toBe(false);
    // The same with the alarm line lost: the banner some 25 ms behind the ok gives it away.
    controller.answerInstead = (line) => {
      if (line !== '$H') return undefined;
      controller.state = 'Idle';
      controller.powerCycle(25);
      return ['ok'];
    };
    expect(await codeOf(clock, positioner.home())).toBe('POSITIONER_RESTARTED');
    expect(positioner.referenceValid).toBe(false);
  });

  it('an unseen restart too near to zero to show is found before anything moves', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    await clock.run(positioner.moveTo({ azimuth: 0.0125 }));
    controller.powerCycle(10, '', false);
    await clock.run(clock.sleep(50));
    const before = motionTargets(controller.lines).length;
    expect(await codeOf(clock, positioner.moveTo({ azimuth: 30 }))).toBe('POSITIONER_RESTARTED');
    expect(motionTargets(controller.lines)).toHaveLength(before);
  });

  it('a stop at rest does not cover up an unseen restart', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    controller.powerCycle(10, '', false);
    await clock.run(clock.sleep(50));
    await clock.run(positioner.stop());
    expect(positioner.referenceValid).toBe(false);
    expect(await codeOf(clock, positioner.moveTo({ azimuth: 30 }))).toBe('POSITIONER_RESTARTED');
  });

  it('a wrong place that comes from an unseen restart is told as the restart', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    controller.answerInstead = (line) => {
      if (!line.startsWith('G4')) return undefined;
      controller.powerCycle(1, '', false);
      return ['ok'];
    };
    expect(await codeOf(clock, positioner.moveTo({ azimuth: 1 }))).toBe('POSITIONER_RESTARTED');
  });

  it('a restart while nobody was connected, its banner missed, shows by the forgotten modes', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    await clock.run(positioner.moveTo({ azimuth: 60 }));
    await controller.hangUp();
    controller.powerCycle(10, '', false);
    await clock.run(clock.sleep(5_000));
    await clock.run(positioner.identify());
    expect(await codeOf(clock, positioner.home())).toBe('POSITIONER_REFERENCE_LOST');
  });

  it('a dropped link ends the move; after reconnecting the axes have to be homed', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    const moving = codeOf(clock, positioner.moveTo({ azimuth: 60 }));
    clock.at(clock.monotonicMs() + 1_000, () => void controller.hangUp());
    expect(await moving).toBe('LINK_CLOSED');
    expect(positioner.referenceValid).toBe(false);
    await clock.run(clock.sleep(5_000));
    await clock.run(positioner.identify());
    expect(await codeOf(clock, positioner.moveTo({ azimuth: 20 }))).toBe('POSITIONER_RESTARTED');
    // The controller went on to the end of its leg and forgot nothing: its counter is believed.
    await clock.run(positioner.home());
    expect((await clock.run(positioner.readPosition()))['azimuth']).toBe(60);
  });
});
