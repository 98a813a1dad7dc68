// The extended edition: rotary axis, deep buffers, sticky errors, gentle stop, its own reports; as recorded
// from the 32-bit descendant of the family in its own host simulator.
import { describe, expect, it } from 'vitest';
import { ControllerTerminal } from '../../../support/controller-terminal.ts';

async function opened(settings: Record<number, number> = {}): Promise<ControllerTerminal> {
  const terminal = new ControllerTerminal({ edition: 'extended', settings });
  await terminal.open();
  return terminal;
}

describe('extended edition', () => {
  it('turns a rotary axis past 360° and keeps inches off it', async () => {
    const terminal = await opened();
    await terminal.ask('G0 A400');
    await terminal.ask('G4 P0.01');
    expect(await terminal.status()).toContain('MPos:0.000,0.000,0.000,400.000|Bf:100,1023|');
    await terminal.ask('G20');
    await terminal.ask('G0 A10');
    await terminal.ask('G4 P0.01');
    expect(await terminal.status()).toContain(',10.000|');
  });

  it('repeats an error for every G-code line until an empty or a $ line', async () => {
    const terminal = await opened();
    for (const line of ['G0 A5 Q7', 'G0 A5', 'G4 P0.01'])
      expect(await terminal.ask(line)).toEqual(['error:36']);
    expect(await terminal.ask('')).toEqual(['ok']);
    expect(await terminal.ask('G0 A5')).toEqual(['ok']);
    expect(await terminal.ask('M399')).toEqual(['error:20']);
    expect(await terminal.ask('G4P0.01')).toEqual(['error:20']);
    expect((await terminal.ask('$G')).at(-1)).toBe('ok');
    expect(await terminal.ask('G4P0.01')).toEqual(['ok']);
  });

  it('makes the error of a refused $ line stick', async () => {
    const terminal = await opened();
    await terminal.ask('G1 A40 F600');
    await terminal.wait(100);
    expect(await terminal.ask('$22')).toEqual(['error:8']);
    expect(await terminal.ask('G0 A10')).toEqual(['error:8']);
  });

  it('counts CR LF once and LF LF twice, and prints a remark from a comment', async () => {
    const terminal = await opened();
    await terminal.write('G4P0.01\r\n');
    expect(await terminal.listen(300)).toEqual(['ok']);
    await terminal.write('G4P0.01\n\n');
    expect(await terminal.listen(300)).toEqual(['ok', 'ok']);
    expect(await terminal.ask('(MSG,hello)')).toEqual(['[MSG:hello]', 'ok']);
  });

  it('gives no false ok after a reset in motion', async () => {
    const terminal = await opened();
    await terminal.ask('G91 G1 A30 F1800');
    await terminal.write('G4 P1\n');
    await terminal.wait(400);
    await terminal.write(0x18);
    expect(await terminal.listen(400)).toEqual([
      'ALARM:3',
      '',
      "GrblHAL 1.1f ['$' or '$HELP' for help]",
      "[MSG:'$H'|'$X' to unlock]",
    ]);
  });

  it('stops gently on 0x19: slows down, forgets the queue, Idle', async () => {
    const terminal = await opened();
    await terminal.ask('G1 A40 F1200');
    await terminal.ask('G1 A0');
    await terminal.wait(500);
    await terminal.write(0x19);
    expect(await terminal.listen(200)).toEqual(['[MSG:Stop]']);
    expect(await terminal.status()).toMatch(/^<Idle\|/);
    const shaft = terminal.controller.shaftAt(terminal.clock.monotonicMs())[3]!;
    expect(shaft).toBeGreaterThan(9);
    expect(shaft).toBeLessThan(12);
  });

  it('insists on homing when set so', async () => {
    const terminal = await opened();
    await terminal.ask('$22=7');
    await terminal.write(0x18);
    expect(await terminal.listen(300)).toEqual([
      '',
      "GrblHAL 1.1f ['$' or '$HELP' for help]",
      'ALARM:11',
      '[MSG:Homing cycle required]',
    ]);
    expect(await terminal.ask('$X')).toEqual(['error:46']);
    await terminal.write(0x87);
    expect((await terminal.listen(50))[0]).toMatch(/^<Alarm:11\|.*FW:/);
  });

  it('reports by itself after the next power-up, until 0x8c', async () => {
    const terminal = await opened();
    await terminal.ask('$481=200');
    expect(await terminal.listen(1000)).toEqual([]);
    terminal.controller.restart();
    await terminal.wait(100);
    expect(await terminal.listen(1000)).toHaveLength(5);
    await terminal.write(0x8c);
    expect(await terminal.listen(1000)).toEqual([]);
  });
});
