// The simulated position-report controller against recordings of a real one (a 2.0.x build on an emulated board):
// the same lines in, the same lines out. Where time is checked, the figure recorded stands beside it.
import { describe, expect, it } from 'vitest';
import { MemoryPort } from '../../../../drivers/link/memory.ts';
import {
  PositionReportController,
  type ReportControllerOptions,
} from '../../../../mocks/positioner-report/report-controller.ts';
import { SimulatedClock } from '../../../../mocks/simulated-clock.ts';

/** The recorded board: 100 steps per unit, 60 units/s; its acceleration was set to 360. */
const recordedBoard = { 100: 100, 101: 100, 102: 100, 110: 3600, 120: 360 };

class Terminal {
  readonly clock = new SimulatedClock();
  readonly controller: PositionReportController;
  readonly heard: { text: string; atMs: number }[] = [];
  readonly #link;

  constructor(options: ReportControllerOptions = {}) {
    this.controller = new PositionReportController(this.clock, {
      ...options,
      settings: { ...recordedBoard, ...options.settings },
    });
    const port = new MemoryPort(this.clock, 'memory://terminal');
    port.listen((visitor) => this.controller.connect(visitor));
    this.#link = port.link();
    this.#link.received$.subscribe((bytes) => {
      const text = Buffer.from(bytes).toString('latin1').trim();
      this.heard.push({ text, atMs: this.clock.monotonicMs() });
    });
  }

  async open(): Promise<this> {
    await this.clock.run(this.#link.open());
    await this.pass(3_000);
    return this;
  }

  pass(ms: number): Promise<void> {
    return this.clock.run(this.clock.sleep(ms));
  }

  /** Sends and returns what comes within `ms`. */
  async say(text: string, ms = 500): Promise<string[]> {
    this.heard.length = 0;
    await this.#link.write(Buffer.from(`${text}\n`));
    await this.pass(ms);
    return this.heard.map((line) => line.text);
  }
}

const terminal = (options?: ReportControllerOptions): Promise<Terminal> => new Terminal(options).open();

describe('the simulated position-report controller, as recorded', () => {
  it('begins with start and its settings', async () => {
    const { heard } = await terminal();
    const texts = heard.map((line) => line.text);
    expect(texts[0]).toBe('start');
    expect(texts).toContain('echo: M92 X100.00 Y100.00 Z100.00 E100.00');
    expect(texts).toContain('echo:  M203 X60.00 Y30.00 Z30.00 E60.00');
  });

  it.each([
    ['G999', ['echo:Unknown command: "G999"', 'ok']],
    ['foo', ['echo:Unknown command: "foo"', 'ok']],
    ['?', ['echo:Unknown command: "?"', 'ok']],
    ['$$', ['echo:Unknown command: "$$"', 'ok']],
    ['g1 x2', ['echo:Unknown command: "g1 x2"', 'ok']],
    ['(paren comment) G1 X2', ['echo:Unknown command: "(paren comment) G1 X2"', 'ok']],
    ['', []],
    [';only a comment', []],
    ['G1 X', ['ok']],
    ['G1 Q5', ['ok']],
    ['G4 P1\r', ['ok']],
    ['G90*1', ['ok']],
    ['M114', ['X:0.00 Y:0.00 Z:0.00 E:0.00 Count X:0 Y:0 Z:0', 'ok']],
    ['M211', ['echo:Soft endstops: OFF  Min:  X0.00 Y0.00 Z0.00   Max:  X200.00 Y200.00 Z200.00', 'ok']],
  ])('%j is answered %j', async (line, answer) => {
    expect(await (await terminal()).say(line)).toEqual(answer);
  });

  it('keeps count of numbered lines', async () => {
    const at = await terminal();
    expect(await at.say('M110 N0')).toEqual(['ok']);
    expect(await at.say('N1 G91*16')).toEqual(['ok']);
    expect(await at.say('N2 G1 X1 F600*51')).toEqual(['ok']);
    expect(await at.say('N3 G1 X1*17')).toEqual(['Error:checksum mismatch, Last Line: 2', 'Resend: 3']);
    expect(await at.say('N3 G1 X1 F600*50')).toEqual(['ok']);
    expect(await at.say('N7 G1 X1*102')).toEqual([
      'Error:Line Number is not Last Line Number+1, Last Line: 3',
      'Resend: 4',
    ]);
    expect(await at.say('N4 G1 X1')).toEqual([
      'Error:No Checksum with line number, Last Line: 3',
      'Resend: 4',
    ]);
    expect(await at.say('N4 G90*20')).toEqual(['ok']);
    expect(await at.say('M110 N100*34')).toEqual(['ok']);
    expect(await at.say('N101 M114*39')).toEqual(['X:2.00 Y:0.00 Z:0.00 E:0.00 Count X:200 Y:0 Z:0', 'ok']);
  });

  it('names the target in motion, and the place only when asked for it; a barrier takes the motion', async () => {
    const at = await terminal();
    await at.say('G1 X180 F1800', 20);
    expect((await at.say('M114', 20))[0]).toBe('X:180.00 Y:0.00 Z:0.00 E:0.00 Count X:18000 Y:0 Z:0');
    await at.pass(500);
    const [place] = await at.say('M114 R', 20);
    // Recorded after 0.56 s: 12.34.
    expect(Number(/^X:([\d.]+)/.exec(place ?? '')?.[1])).toBeGreaterThan(10);
    expect(Number(/^X:([\d.]+)/.exec(place ?? '')?.[1])).toBeLessThan(20);
    expect(await at.say('M400', 6_000)).toEqual(['echo:busy: processing', 'echo:busy: processing', 'ok']);
    expect((await at.say('M114 R'))[0]).toBe('X:180.00 Y:0.00 Z:0.00 E:0.00 Count X:18000 Y:0 Z:0');
  });

  it('names the target even when asked for the place in a plain build', async () => {
    const at = await terminal({ truePositions: false });
    await at.say('G1 X60 F600', 20);
    expect((await at.say('M114 R', 20))[0]).toBe('X:60.00 Y:0.00 Z:0.00 E:0.00 Count X:6000 Y:0 Z:0');
  });

  it('ends pulses at once, answers a second later, and the barrier that waited with it', async () => {
    const at = await terminal();
    await at.say('G1 X60 F1200', 20);
    await at.say('M400', 800);
    const stopMs = at.clock.monotonicMs();
    expect(await at.say('M410', 1_500)).toEqual(['ok', 'ok']);
    // Recorded: 1.025 s, both answers together.
    for (const { atMs } of at.heard) expect(atMs - stopMs).toBeCloseTo(1_025, -2);
    const [place] = await at.say('M114');
    expect(Number(/^X:([\d.]+)/.exec(place ?? '')?.[1])).toBeGreaterThan(10);
    expect(Number(/^X:([\d.]+)/.exec(place ?? '')?.[1])).toBeLessThan(20);
  });

  it.each(['M112', 'M112x'])('%s halts it until its reset', async (line) => {
    const at = await terminal();
    expect(await at.say(line)).toEqual(['Error:Printer halted. kill() called!']);
    expect(await at.say('M114')).toEqual([]);
    expect(await at.say('M999')).toEqual([]);
    at.controller.restart();
    await at.pass(500);
    expect((await at.say('M114')).at(-1)).toBe('ok');
  });

  it('halts when homing finds no switch', async () => {
    const at = await terminal();
    expect((await at.say('G28 X', 120_000)).at(-1)).toBe('Error:Printer halted. kill() called!');
  });

  it('sets a zero by hand, while its step counter goes on', async () => {
    const at = await terminal();
    await at.say('G1 X1 F600', 1_000);
    expect(await at.say('G92 X0')).toEqual(['X:0.00 Y:0.00 Z:0.00 E:0.00 Count X:100 Y:0 Z:0', 'ok']);
    await at.say('G1 X5 F3600', 2_000);
    expect((await at.say('M114'))[0]).toBe('X:5.00 Y:0.00 Z:0.00 E:0.00 Count X:600 Y:0 Z:0');
  });

  it('says wait every second and tells its queue in a talkative build', async () => {
    const at = await terminal({ chatty: true });
    expect(await at.say('G90', 10)).toEqual(['ok P15 B3']);
    at.heard.length = 0;
    await at.pass(3_000);
    expect(at.heard.map((line) => line.text)).toEqual(['wait', 'wait', 'wait']);
  });
});
