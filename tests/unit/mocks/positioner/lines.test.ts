// What the simulated controller answers to which line, against recordings of a real 8-bit controller of the
// family (firmware 1.1h on its own processor, emulated): every pair below stood on that wire.
import { describe, expect, it } from 'vitest';
import { ControllerTerminal } from '../../../support/controller-terminal.ts';

const answers: [line: string, answer: string][] = [
  ['G1 X5', 'error:22'],
  ['G0 Q5', 'error:20'],
  ['G999', 'error:20'],
  ['X', 'error:2'],
  ['G0 X', 'error:2'],
  ['G0 X1e2', 'error:20'],
  ['G0 X1 X2', 'error:25'],
  ['G0 A10', 'error:20'],
  ['M114', 'error:20'],
  ['M400', 'error:23'],
  ['M115', 'error:20'],
  ['M112', 'error:20'],
  ['T1', 'ok'],
  ['G28', 'ok'],
  ['N10 G0 X0', 'ok'],
  ['N1 G0 X0*87', 'error:1'],
  ['G4', 'error:28'],
  ['G4 P0', 'ok'],
  ['G91', 'ok'],
  ['G90', 'ok'],
  ['g0 x0', 'ok'],
  ['(only a comment)', 'ok'],
  ['G0 (in the middle) X0 ; tail', 'ok'],
  ['%', 'error:1'],
  ['/G0 X0', 'ok'],
  ['G53 X0', 'ok'],
  ['G0 Y0.0001', 'ok'],
  ['F-1', 'error:4'],
  ['G1 F100', 'ok'],
  ['G93', 'ok'],
  ['G94', 'ok'],
  ['$H', 'error:5'],
  ['$20=1', 'error:10'],
  ['$J=X1', 'error:22'],
  ['$J=X1 F0', 'error:22'],
  ['$J=F100', 'ok'],
  ['G20', 'ok'],
  ['G21', 'ok'],
  ['$0=1', 'error:6'],
  ['$999=1', 'error:3'],
  ['$100=', 'error:2'],
  ['$100=abc', 'error:2'],
  ['$foo', 'error:2'],
  ['', 'ok'],
];

describe('answers to single lines', () => {
  for (const [line, answer] of answers) {
    it(`answers ${answer} to '${line}'`, async () => {
      const terminal = new ControllerTerminal();
      await terminal.open();
      expect((await terminal.ask(line)).at(-1)).toBe(answer);
    });
  }

  it('keeps nothing of a refused line', async () => {
    const terminal = new ControllerTerminal();
    await terminal.open();
    await terminal.ask('G91 G1 F300 X5 P1');
    expect((await terminal.ask('$G'))[0]).toBe('[GC:G0 G54 G17 G21 G90 G94 M5 M9 T0 F0 S0]');
  });
});

describe('line ends and lengths', () => {
  it('confirms twice after CR LF and once after CR', async () => {
    const terminal = new ControllerTerminal();
    await terminal.open();
    await terminal.write('G4 P0.01\r\n');
    expect(await terminal.listen(300)).toEqual(['ok', 'ok']);
    await terminal.write('G4 P0.01\r');
    expect(await terminal.listen(300)).toEqual(['ok']);
  });

  it('takes 79 characters, refuses 80, and does not count comments', async () => {
    const terminal = new ControllerTerminal();
    await terminal.open();
    expect(await terminal.ask(`G4P0.01${'0'.repeat(72)}`)).toEqual(['ok']);
    expect(await terminal.ask(`G4P0.01${'0'.repeat(73)}`)).toEqual(['error:11']);
    expect(await terminal.ask(`G4P0.01(${'x'.repeat(150)})`)).toEqual(['ok']);
  });

  it('swallows bytes above 0x7f and reads eight digits of a number', async () => {
    const terminal = new ControllerTerminal();
    await terminal.open();
    await terminal.write('G4 P0.01\xc3\xa9\n');
    expect(await terminal.listen(300)).toEqual(['ok']);
    await terminal.ask('G0 X12.3456789');
    await terminal.ask('G4 P0.01');
    expect(await terminal.status()).toContain('MPos:12.350,');
  });

  it('loses what does not fit into 128 bytes and says nothing', async () => {
    const terminal = new ControllerTerminal();
    await terminal.open();
    await terminal.write('G4 P2\n');
    await terminal.wait(100);
    // Recording: 12 lines of 25 bytes behind a dwell; 6 answers in all instead of 13.
    await terminal.write('G1 X1.00000000000 F600.0\n'.repeat(12));
    const heard = await terminal.listen(6000);
    expect(heard.filter((text) => text === 'ok')).toHaveLength(6);
  });

  it('loses nothing of the same lines when nothing blocks', async () => {
    const terminal = new ControllerTerminal();
    await terminal.open();
    await terminal.write('G1 X1.00000000000 F600.0\n'.repeat(12));
    expect(await terminal.listen(3000)).toEqual(new Array(12).fill('ok'));
  });
});

describe('queries', () => {
  it('prints identity, parameters and settings', async () => {
    const terminal = new ControllerTerminal();
    await terminal.open();
    expect(await terminal.ask('$I=roof')).toEqual(['ok']);
    expect(await terminal.ask('$I')).toEqual(['[VER:1.1h.20190830:roof]', '[OPT:V,15,128]', 'ok']);
    const settings = await terminal.ask('$$');
    expect(settings).toHaveLength(35);
    expect(settings[0]).toBe('$0=10');
    expect(settings).toContain('$100=80.000');
    expect(await terminal.ask('$#')).toContain('[PRB:0.000,0.000,0.000:0]');
  });

  it('keeps settings and offsets over a restart, not the temporary shift', async () => {
    const terminal = new ControllerTerminal();
    await terminal.open();
    await terminal.ask('$110=900');
    await terminal.ask('G10 L2 P1 X-5');
    await terminal.ask('G92 X100');
    terminal.controller.restart();
    await terminal.wait(100);
    expect(await terminal.ask('$$')).toContain('$110=900.000');
    const parameters = await terminal.ask('$#');
    expect(parameters).toContain('[G54:-5.000,0.000,0.000]');
    expect(parameters).toContain('[G92:0.000,0.000,0.000]');
  });
});
