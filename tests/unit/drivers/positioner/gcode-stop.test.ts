import { describe, expect, it } from 'vitest';
import { isDriverError } from '../../../../drivers/errors.ts';
import { MemoryPort } from '../../../../drivers/link/memory.ts';
import { GcodePositioner } from '../../../../drivers/positioner/gcode-positioner.ts';
import { SimulatedClock } from '../../../../mocks/simulated-clock.ts';
import { azimuth, codeOf, failureOf, makeReadyRig, makeRig } from '../../../support/positioner-rig.ts';

const hold = 0x21;
const softReset = 0x18;
const query = 0x3f;

describe('stop', () => {
  it('in a move: holds in the turn of the call, resets only when it stands, keeps the reference', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    const moving = failureOf(clock, positioner.moveTo({ azimuth: 100 }));
    let calledMs = 0;
    const stopping = clock.run(
      clock.sleep(2_000).then(() => {
        calledMs = clock.monotonicMs();
        return positioner.stop();
      }),
    );
    expect((await moving)?.code).toBe('POSITIONER_STOPPED');
    const report = await stopping;
    const holds = controller.urgent.filter(({ byte }) => byte === hold);
    const resets = controller.urgent.filter(({ byte }) => byte === softReset);
    // The wire takes 2 ms.
    expect(holds.map(({ ms }) => ms)).toEqual([calledMs + 2]);
    expect(resets).toHaveLength(1);
    // The controller takes 120 ms to come to rest.
    expect(resets[0]!.ms - calledMs).toBeGreaterThan(122);
    expect(report.haltMs).toBeGreaterThanOrEqual(122);
    expect(report.haltMs).toBeLessThan(300);
    expect(report.position['azimuth']).toBeCloseTo(controller.position[0]!, 3);
    expect(controller.state).toBe('Idle');
    expect(positioner.referenceValid).toBe(true);
    // And on it goes, from the approach side.
    expect((await clock.run(positioner.moveTo({ azimuth: 10 }))).position['azimuth']).toBe(10);
  });

  it('leaves no byte of a move behind it', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    const moving = codeOf(clock, positioner.moveTo({ azimuth: 0 }, { throughApproach: true }));
    const waiting = codeOf(clock, positioner.moveTo({ azimuth: 50 }));
    await clock.run(clock.sleep(150).then(() => positioner.stop()));
    expect([await moving, await waiting]).toEqual(['POSITIONER_STOPPED', 'POSITIONER_STOPPED']);
    const after = controller.lines.length;
    await clock.run(clock.sleep(10_000));
    expect(controller.lines).toHaveLength(after);
    expect(controller.lines.slice(-2)).toEqual(['G18 G21 G90 G94', '$G']);
  });

  it('right after the line left: the line never runs', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    const moving = codeOf(clock, positioner.moveTo({ azimuth: 100 }));
    const lineSent = async (): Promise<void> => {
      while (!controller.lines.some((line) => line.includes('G1 '))) await clock.sleep(1);
    };
    const report = await clock.run(lineSent().then(() => positioner.stop()));
    expect(await moving).toBe('POSITIONER_STOPPED');
    expect(report.position['azimuth']).toBeLessThan(5);
    await clock.run(clock.sleep(10_000));
    expect(controller.position[0]).toBeCloseTo(report.position['azimuth']!, 3);
  });

  it('at rest: asks and confirms, and sends no hold, which would lock the controller', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    await clock.run(positioner.moveTo({ azimuth: 10 }));
    const before = controller.urgent.length;
    const report = await clock.run(positioner.stop());
    expect(report.position['azimuth']).toBe(10);
    expect(new Set(controller.urgent.slice(before).map(({ byte }) => byte))).toEqual(new Set([query]));
    expect(controller.state).toBe('Idle');
    expect(positioner.referenceValid).toBe(true);
  });

  it('twice: both calls get the one outcome, and one hold is sent', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    const moving = codeOf(clock, positioner.moveTo({ azimuth: 100 }));
    await clock.run(clock.sleep(1_000));
    const first = positioner.stop();
    const second = positioner.stop();
    expect(await clock.run(first)).toBe(await clock.run(second));
    expect(await moving).toBe('POSITIONER_STOPPED');
    expect(controller.urgent.filter(({ byte }) => byte === hold)).toHaveLength(1);
  });

  it('repeats a hold that got lost', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    const moving = codeOf(clock, positioner.moveTo({ azimuth: 100 }));
    await clock.run(clock.sleep(1_000));
    controller.ignoresHold = true;
    clock.at(clock.monotonicMs() + 200, () => {
      controller.ignoresHold = false;
    });
    const report = await clock.run(positioner.stop());
    expect(await moving).toBe('POSITIONER_STOPPED');
    expect(report.haltMs).toBeLessThan(1_000);
    expect(positioner.referenceValid).toBe(true);
  });

  it('resets where no hold works, and then trusts the position no more', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    const moving = codeOf(clock, positioner.moveTo({ azimuth: 180 }));
    await clock.run(clock.sleep(1_000));
    controller.ignoresHold = true;
    await clock.run(positioner.stop());
    expect(await moving).toBe('POSITIONER_STOPPED');
    expect(controller.moving).toBe(false);
    expect(controller.position[0]).toBeLessThan(100);
    expect(positioner.referenceValid).toBe(false);
    expect(await codeOf(clock, positioner.moveTo({ azimuth: 0 }))).toBe('POSITIONER_REFERENCE_LOST');
  });

  it('ends a homing cycle by a reset at once', async () => {
    const axes = [{ ...azimuth, homing: 'switch' as const }];
    const { clock, controller, positioner } = await makeReadyRig(
      { homedAt: [-1, -1, -1], homingMs: 8_000 },
      { axes },
    );
    const homing = codeOf(clock, positioner.home());
    await clock.run(clock.sleep(2_000));
    const calledMs = clock.monotonicMs();
    const report = await clock.run(positioner.stop());
    expect(await homing).toBe('POSITIONER_STOPPED');
    expect(controller.urgent.filter(({ byte }) => byte === softReset).map(({ ms }) => ms)).toEqual([
      calledMs + 2,
    ]);
    expect(report.haltMs).toBeLessThan(1_000);
    expect(positioner.referenceValid).toBe(false);
  });

  it('releases a hold pressed by hand together with what was queued behind it', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    const moving = codeOf(clock, positioner.moveTo({ azimuth: 100 }));
    clock.at(clock.monotonicMs() + 1_000, () => controller.press('!'));
    expect(await moving).toBe('POSITIONER_HELD');
    await clock.run(positioner.stop());
    controller.press('~');
    await clock.run(clock.sleep(10_000));
    expect(controller.position[0]).toBeLessThan(30);
    expect(positioner.referenceValid).toBe(true);
  });

  it('gets a controller out of an alarm that makes it mute', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    controller.alarm(1, true);
    await clock.run(clock.sleep(100));
    await clock.run(positioner.stop());
    expect(controller.mute).toBe(false);
    expect(positioner.referenceValid).toBe(false);
  });

  it('is not claimed when nobody answers, within a few seconds', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    const moving = codeOf(clock, positioner.moveTo({ azimuth: 100 }));
    await clock.run(clock.sleep(1_000));
    controller.spoil = () => undefined;
    const calledMs = clock.monotonicMs();
    expect(await codeOf(clock, positioner.stop())).toBe('POSITIONER_STOP_UNCONFIRMED');
    expect(clock.monotonicMs() - calledMs).toBeLessThan(6_000);
    expect(await moving).toBe('POSITIONER_STOPPED');
    const bytes = controller.urgent.map(({ byte }) => byte);
    expect(bytes.indexOf(hold)).toBeGreaterThan(0);
    expect(bytes.lastIndexOf(softReset)).toBeGreaterThan(bytes.indexOf(hold));
    // Once more, for the first may have been lost.
    expect(bytes.filter((byte) => byte === softReset)).toHaveLength(2);
  });

  it('opens a link that has dropped in a move, stops, and closes it again', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    const moving = codeOf(clock, positioner.moveTo({ azimuth: 180 }));
    clock.at(clock.monotonicMs() + 1_000, () => void controller.hangUp());
    expect(await moving).toBe('LINK_CLOSED');
    await clock.run(positioner.stop());
    expect(controller.moving).toBe(false);
    expect(controller.position[0]).toBeLessThan(100);
    await expect(clock.run(positioner.readPosition())).rejects.toMatchObject({
      code: 'POSITIONER_RESTARTED',
    });
    await clock.run(positioner.identify());
  });

  it('says so when there is no link to be had', async () => {
    const clock = new SimulatedClock();
    const nobody = new MemoryPort(clock, 'memory://nobody').link();
    const positioner = new GcodePositioner(nobody, clock, { axes: [azimuth] });
    const failure = await failureOf(clock, positioner.stop());
    expect(failure?.code).toBe('POSITIONER_STOP_UNCONFIRMED');
    expect(isDriverError(failure?.cause, 'LINK_OPEN_FAILED')).toBe(true);
  });

  it('works after a close, and leaves the link closed', async () => {
    const { clock, positioner } = await makeReadyRig();
    await clock.run(positioner.close());
    expect((await clock.run(positioner.stop())).position).toEqual({ azimuth: 0, elevation: 0 });
    expect(await codeOf(clock, positioner.moveTo({ azimuth: 10 }))).toBe('POSITIONER_RESTARTED');
  });

  it('stops what was moving before we came, and then connects', async () => {
    const { clock, controller, positioner } = makeRig();
    const connecting = codeOf(clock, positioner.identify());
    clock.at(clock.monotonicMs() + 1_000, () => controller.sendAsStranger('G1 X100 F600'));
    expect(await connecting).toBe('POSITIONER_BUSY_AT_CONNECT');
    expect(controller.urgent.map(({ byte }) => byte)).not.toContain(softReset);
    await clock.run(positioner.stop());
    expect(controller.moving).toBe(false);
    await clock.run(positioner.identify());
    expect(positioner.referenceValid).toBe(false);
  });

  it('carries the cause of an unconfirmed stop', async () => {
    const { clock, controller, positioner } = await makeReadyRig();
    controller.spoil = () => undefined;
    const failure = await failureOf(clock, positioner.stop());
    expect(failure?.code).toBe('POSITIONER_STOP_UNCONFIRMED');
    expect(isDriverError(failure?.cause, 'POSITIONER_NOT_ANSWERING')).toBe(true);
  });
});
