// A quirky controller over a real socket and in real time, once: identify, home, arrive, stop.
import { expect, it } from 'vitest';
import { SystemClock } from '../../../../drivers/clock.ts';
import { listenTcp, TcpLink } from '../../../../drivers/link/tcp.ts';
import { GcodePositioner } from '../../../../drivers/positioner/gcode-positioner.ts';
import { azimuth } from '../../../support/positioner-rig.ts';
import { QuirkyController } from '../../../support/quirky-controller.ts';

it('arrives and halts over TCP with a controller full of quirks', async () => {
  const clock = new SystemClock();
  const controller = new QuirkyController(clock, {
    banner: "GrblMotion 3.0 [stage 3.0.1 '$' for help]",
    bootText: ['boot: v2', 'rst:0x1'],
    bootMs: 300,
    lockedAtStart: true,
    lineEnd: '\n',
    axes: 4,
    reports: 'work',
    offset: 12.5,
    fields: ['Bf:15,128', 'Ln:9', 'FS:0,0', 'A:'],
    positionLast: true,
    idleWord: 'Idle:0',
    settingsOrder: 'mixed',
    settingComments: true,
    remarks: 0.6,
    okDelayMs: 20,
    holdLateMs: 100,
    stickyErrors: true,
  });
  const listener = await listenTcp('127.0.0.1', 0, controller.accept);
  const axes = [{ ...azimuth, approachDeg: 0, settleMs: 0 }];
  const positioner = new GcodePositioner(TcpLink.to('127.0.0.1', listener.port, clock), clock, { axes });
  try {
    await positioner.identify();
    await positioner.home();
    await positioner.moveTo({ azimuth: 5 });
    expect(controller.shafts[0]).toBeCloseTo(5, 9);
    const moving = positioner.moveTo({ azimuth: 100 });
    const outcome = expect(moving).rejects.toMatchObject({ code: 'POSITIONER_STOPPED' });
    await clock.sleep(400);
    const { position } = await positioner.stop();
    await outcome;
    expect(controller.moving).toBe(false);
    expect(controller.shafts[0]).toBeGreaterThan(5);
    // Reports have three decimals.
    expect(Math.abs((controller.shafts[0] ?? Number.NaN) - (position['azimuth'] ?? Number.NaN))).toBeLessThan(
      0.001,
    );
  } finally {
    await positioner.close();
    await listener.close();
  }
}, 20_000);
