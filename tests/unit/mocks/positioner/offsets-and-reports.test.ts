// Reports: which field comes when, machine against work position, overrides; as on a real controller's wire
// (firmware 1.1h).
import { describe, expect, it } from 'vitest';
import { ControllerTerminal } from '../../../support/controller-terminal.ts';

describe('status reports', () => {
  it('brings the offset first, the overrides second, then neither', async () => {
    const terminal = new ControllerTerminal();
    await terminal.open();
    expect(await terminal.status()).toBe('<Idle|MPos:0.000,0.000,0.000|FS:0,0|WCO:0.000,0.000,0.000>');
    expect(await terminal.status()).toBe('<Idle|MPos:0.000,0.000,0.000|FS:0,0|Ov:100,100,100>');
    for (let count = 0; count < 8; count += 1) {
      expect(await terminal.status()).toBe('<Idle|MPos:0.000,0.000,0.000|FS:0,0>');
    }
    expect(await terminal.status()).toContain('WCO:');
  });

  it('shows free blocks and bytes with $10=3', async () => {
    const terminal = new ControllerTerminal({ settings: { 10: 3 } });
    await terminal.open();
    expect(await terminal.status()).toContain('|Bf:15,128|');
  });

  it('answers several requests before the report once', async () => {
    const terminal = new ControllerTerminal();
    await terminal.open();
    await terminal.write('?????????');
    expect(await terminal.listen(100)).toHaveLength(1);
  });

  it('takes a request out of the middle of a line', async () => {
    const terminal = new ControllerTerminal();
    await terminal.open();
    await terminal.write('G1 X?2 F1200\n');
    expect(await terminal.listen(50)).toEqual([expect.stringContaining('<Idle|'), 'ok']);
    await terminal.wait(1000);
    expect(await terminal.status()).toContain('MPos:2.000,');
  });

  it('prints the nearest step: 33.3333 at 80 steps per degree is 33.338', async () => {
    const terminal = new ControllerTerminal();
    await terminal.open();
    await terminal.ask('G0 X33.3333');
    await terminal.ask('G4 P0.01');
    expect(await terminal.status()).toContain('MPos:33.338,');
    expect(terminal.controller.shaftAt(terminal.clock.monotonicMs())[0]).toBeCloseTo(2667 / 80, 9);
  });
});

describe('work and machine position', () => {
  it('follows G92, G10 and $10 as recorded', async () => {
    const terminal = new ControllerTerminal();
    await terminal.open();
    await terminal.ask('G0 X10');
    await terminal.ask('G4P0.01');
    await terminal.status();
    await terminal.ask('G92 X0');
    expect(await terminal.status()).toContain('WCO:10.000,0.000,0.000');
    await terminal.ask('G10 L20 P1 X5');
    expect(await terminal.status()).toContain('WCO:5.000,0.000,0.000');
    expect(await terminal.ask('$#')).toContain('[G54:-5.000,0.000,0.000]');
    await terminal.ask('G92.1');
    expect(await terminal.status()).toContain('WCO:-5.000,0.000,0.000');
    await terminal.ask('$10=0');
    expect(await terminal.status()).toContain('WPos:15.000,');
    await terminal.ask('$10=1');
    await terminal.ask('G53 G0 X0');
    await terminal.ask('G4P0.01');
    expect(await terminal.status()).toContain('MPos:0.000,');
  });

  it('moves in inches, by increments and in machine coordinates', async () => {
    const terminal = new ControllerTerminal();
    await terminal.open();
    await terminal.ask('G20 G91 G0 X1');
    await terminal.ask('G0 X1');
    await terminal.ask('G4P0.01');
    expect(await terminal.status()).toContain('MPos:50.800,');
    await terminal.ask('$13=1');
    expect(await terminal.status()).toContain('MPos:2.0000,');
  });

  it('reads the same steps as another place after the steps setting is changed', async () => {
    const terminal = new ControllerTerminal({ mechanics: { X: { stepsPerUnit: 80 } } });
    await terminal.open();
    await terminal.ask('G0 X10');
    await terminal.ask('G4P0.01');
    await terminal.ask('$100=160');
    expect(await terminal.status()).toContain('MPos:5.000,');
    await terminal.ask('G0 X10');
    await terminal.ask('G4P0.01');
    // 800 steps more at 80 steps per degree of the drive.
    expect(terminal.controller.poseAt(terminal.clock.monotonicMs()).azimuthDeg).toBeCloseTo(20, 9);
  });
});

describe('overrides', () => {
  it('stretches a move and shows it in the next report', async () => {
    const terminal = new ControllerTerminal();
    await terminal.open();
    for (let count = 0; count < 5; count += 1) await terminal.write(0x92);
    const startMs = terminal.clock.monotonicMs();
    await terminal.ask('G1 X10 F600');
    await terminal.ask('G4 P0');
    // 10 at 5/s plus 5/360 s, plus a few milliseconds of reading and starting.
    expect(terminal.clock.monotonicMs() - startMs).toBeGreaterThan(2013);
    expect(terminal.clock.monotonicMs() - startMs).toBeLessThan(2030);
    await terminal.status();
    expect(await terminal.status()).toContain('Ov:50,100,100');
    terminal.controller.restart();
    await terminal.wait(100);
    await terminal.status();
    expect(await terminal.status()).toContain('Ov:100,100,100');
  });
});
