// The same positioner over a real socket and in real time, once: nothing in it may depend on the memory wire.
import { expect, it } from 'vitest';
import { SystemClock } from '../../../../drivers/clock.ts';
import { listenTcp, TcpLink } from '../../../../drivers/link/tcp.ts';
import { GcodePositioner } from '../../../../drivers/positioner/gcode-positioner.ts';
import { azimuth } from '../../../support/positioner-rig.ts';
import { ScriptedController } from '../../../support/scripted-controller.ts';

it('identifies, homes, moves and stops over TCP', async () => {
  const clock = new SystemClock();
  const controller = new ScriptedController(clock);
  const listener = await listenTcp('127.0.0.1', 0, controller.accept);
  const axes = [{ ...azimuth, approachDeg: 0, settleMs: 0 }];
  const positioner = new GcodePositioner(TcpLink.to('127.0.0.1', listener.port, clock), clock, { axes });
  try {
    await positioner.identify();
    await positioner.home();
    expect((await positioner.moveTo({ azimuth: 5 })).position).toEqual({ azimuth: 5 });
    const moving = positioner.moveTo({ azimuth: 100 });
    const outcome = expect(moving).rejects.toMatchObject({ code: 'POSITIONER_STOPPED' });
    await clock.sleep(400);
    const { haltMs, position } = await positioner.stop();
    await outcome;
    expect(haltMs).toBeLessThan(1_000);
    expect(position['azimuth']).toBeGreaterThan(5);
    expect(controller.moving).toBe(false);
    expect(controller.position[0]).toBeCloseTo(position['azimuth']!, 3);
  } finally {
    await positioner.close();
    await listener.close();
  }
});
