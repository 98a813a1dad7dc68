// Homing, soft and hard limits, alarms: order and text as recorded from a real controller (firmware 1.1h);
// times worked by hand.
import { describe, expect, it } from 'vitest';
import { ControllerTerminal } from '../../../support/controller-terminal.ts';

const homingSettings = { 22: 1, 20: 1, 24: 300, 25: 1200, 130: 90 };
const banner = ['', "Grbl 1.1h ['$' for help]", "[MSG:'$H'|'$X' to unlock]"];

async function opened(options = {}): Promise<ControllerTerminal> {
  const terminal = new ControllerTerminal({
    settings: homingSettings,
    mechanics: { X: { switchUnits: 5 } },
    ...options,
  });
  await terminal.open();
  return terminal;
}

describe('homing', () => {
  it('is locked at power-up, mute during the cycle, and ends one pull-off below the switch', async () => {
    const terminal = await opened({ onConnect: 'restarts' });
    expect(terminal.heard.map((heard) => heard.text)).toEqual(banner);
    expect(await terminal.ask('G0 X1')).toEqual(['error:9']);
    const startMs = terminal.clock.monotonicMs();
    await terminal.write('$H\n');
    await terminal.wait(100);
    await terminal.write('?');
    await terminal.until(() => terminal.heard.at(-1)!.text === 'ok', 60_000);
    expect(terminal.heard.at(-2)!.text).toMatch(/^<Home\|MPos:-1\.000,/);
    // Seek 5 at 20/s: 0.25 s + half of 20/360 s; pull off 1 at 20/s: short of 20/s, 2√(1/360) s; find again
    // 1 at 5/s: 0.2 s + half of 5/360 s; pull off at 5/s: 0.2 s + 5/360 s; four times 250 ms.
    const seconds = 0.25 + 10 / 360 + 2 * Math.sqrt(1 / 360) + 0.2 + 2.5 / 360 + 0.2 + 5 / 360 + 1;
    expect(terminal.lastAtMs - startMs).toBeGreaterThan(seconds * 1000);
    expect(terminal.lastAtMs - startMs).toBeLessThan(seconds * 1000 + 20);
    expect(await terminal.status()).toMatch(/^<Idle\|MPos:-1.000,/);
    expect(terminal.controller.shaftAt(terminal.clock.monotonicMs())[0]).toBeCloseTo(4, 6);
  });

  it('does not lock again after a soft reset', async () => {
    const terminal = await opened();
    await terminal.ask('$X');
    await terminal.write(0x18);
    expect(await terminal.listen(100)).toEqual(banner.slice(0, 2));
  });

  it('fails with ALARM:9 and a false ok when the switch is never met', async () => {
    const terminal = await opened({ mechanics: { X: { switchUnits: 500 } } });
    await terminal.write('$H\n');
    const heard = await terminal.listen(10_000);
    expect(heard).toEqual(['ALARM:9', 'ok', ...banner]);
    expect(await terminal.status()).toMatch(/^<Alarm\|/);
  });

  it('fails with ALARM:6 when it is reset', async () => {
    const terminal = await opened();
    await terminal.write('$H\n');
    await terminal.wait(200);
    await terminal.write(0x18);
    expect(await terminal.listen(1000)).toEqual(['ALARM:6', 'ok', ...banner]);
  });

  it('homes to the other side when the direction is inverted: zero is still the upper end', async () => {
    const terminal = await opened({
      settings: { ...homingSettings, 23: 1 },
      mechanics: { X: { switchUnits: -5 } },
    });
    await terminal.ask('$H');
    expect(await terminal.status()).toContain('MPos:-89.000,');
    expect(terminal.controller.shaftAt(terminal.clock.monotonicMs())[0]).toBeCloseTo(-4, 6);
  });
});

describe('soft limits', () => {
  it('refuse a jog with error:15 and lock a move at rest with ALARM:2', async () => {
    const terminal = await opened();
    await terminal.ask('$H');
    expect(await terminal.ask('$J=X10 F600')).toEqual(['error:15']);
    await terminal.write('G0 X10\n');
    expect(await terminal.listen(700)).toEqual(['ALARM:2', '[MSG:Reset to continue]']);
    await terminal.write('?$X\n');
    expect(await terminal.listen(1000)).toEqual([]);
    await terminal.write(0x18);
    expect(await terminal.listen(200)).toEqual(['ok', ...banner]);
    await terminal.ask('$X');
    expect(await terminal.status()).toContain('MPos:-1.000,');
  });

  it('slow down first when the axes move, and keep the place', async () => {
    const terminal = await opened();
    await terminal.ask('$H');
    await terminal.ask('G0 X-80');
    await terminal.wait(200);
    await terminal.write('G0 X-100\n');
    const atMs = terminal.clock.monotonicMs();
    await terminal.until(() => terminal.heard.at(-1)!.text === 'ALARM:2', 500);
    // 30/360 s from full speed.
    expect(terminal.lastAtMs - atMs).toBeGreaterThan(80);
    await terminal.wait(700);
    await terminal.write(0x18);
    await terminal.wait(200);
    const report = await terminal.status();
    const shaft = terminal.controller.shaftAt(terminal.clock.monotonicMs())[0]!;
    expect(Number(/MPos:(-[\d.]+)/.exec(report)![1])).toBeCloseTo(shaft - 5, 1);
  });
});

describe('hard limits', () => {
  it('stop dead with ALARM:1 where the shaft meets the switch, deaf until a reset', async () => {
    const terminal = await opened({ settings: { 21: 1 }, mechanics: { X: { switchUnits: 10 } } });
    await terminal.ask('G91 G1 X20 F600');
    const atMs = terminal.clock.monotonicMs();
    await terminal.until(() => terminal.heard.at(-1)!.text === 'ALARM:1', 2000);
    // 10 at 10/s plus half of 10/360 s.
    expect(terminal.lastAtMs - atMs).toBeGreaterThan(1010);
    expect(terminal.lastAtMs - atMs).toBeLessThan(1030);
    expect(await terminal.listen(700)).toEqual(['[MSG:Reset to continue]']);
    await terminal.write('?$X\n');
    expect(await terminal.listen(500)).toEqual([]);
    await terminal.write(0x18);
    expect(await terminal.listen(200)).toEqual(banner);
    expect(await terminal.status()).toMatch(/^<Alarm\|MPos:10.0.*Pn:X/);
  });

  it('act on a switch forced by hand', async () => {
    const terminal = await opened({ settings: { 21: 1 } });
    await terminal.ask('G91 G1 X3 F600');
    await terminal.wait(100);
    terminal.controller.forceSwitch('Y', true);
    expect(await terminal.listen(600)).toEqual(['ALARM:1', '[MSG:Reset to continue]']);
  });
});
