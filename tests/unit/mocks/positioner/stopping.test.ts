// Moving, holding, resetting, jogging, door: states and places as recorded from a real controller (firmware
// 1.1h, 80 steps/°, 1800 °/min, 360 °/s²), distances and times worked by hand.
import { describe, expect, it } from 'vitest';
import { ControllerTerminal } from '../../../support/controller-terminal.ts';

const placeOf = (report: string): number => Number(/MPos:(-?[\d.]+)/.exec(report)?.[1]);

async function opened(options = {}): Promise<ControllerTerminal> {
  const terminal = new ControllerTerminal(options);
  await terminal.open();
  return terminal;
}

describe('arrival', () => {
  it('confirms a move at once and a dwell only when it has ended', async () => {
    const terminal = await opened();
    const startMs = terminal.clock.monotonicMs();
    await terminal.ask('G1 X90 F1800');
    expect(terminal.lastAtMs - startMs).toBeLessThan(10);
    await terminal.ask('G4 P0.01');
    // 90/30 + 30/360 s, then one dwell tick of 50 ms.
    expect(terminal.lastAtMs - startMs).toBeGreaterThan(3133);
    expect(terminal.lastAtMs - startMs).toBeLessThan(3150);
    expect(await terminal.status()).toContain('<Idle|MPos:90.000,');
  });

  it('reports Idle for a request that travels with the line, although the move has been accepted', async () => {
    const terminal = await opened();
    await terminal.write('G1 X2 F1200\n?');
    expect(await terminal.listen(30)).toEqual(
      expect.arrayContaining([expect.stringMatching(/^<Idle\|MPos:0/), 'ok']),
    );
    expect(await terminal.status()).toContain('<Run|');
  });

  it('reports Idle once even after the ok', async () => {
    const terminal = await opened();
    await terminal.ask('G1 X2 F1200');
    expect(await terminal.status()).toMatch(/^<Idle\|MPos:0/);
    expect(await terminal.status()).toMatch(/^<Run\|/);
  });

  it('is Idle during a dwell and looks at requests every 50 ms', async () => {
    const terminal = await opened();
    await terminal.write('G4 P1\n');
    await terminal.wait(310);
    const askedMs = terminal.clock.monotonicMs();
    expect(await terminal.status()).toContain('<Idle|');
    expect(terminal.lastAtMs - askedMs).toBeGreaterThan(20);
    expect(terminal.lastAtMs - askedMs).toBeLessThan(60);
  });

  it('withholds ok while 15 moves are queued', async () => {
    const terminal = await opened();
    await terminal.ask('G91 G21');
    const tookMs: number[] = [];
    for (let count = 0; count < 18; count += 1) {
      const sentMs = terminal.clock.monotonicMs();
      await terminal.ask('G1 X2 F600');
      tookMs.push(terminal.lastAtMs - sentMs);
    }
    expect(Math.max(...tookMs.slice(0, 15))).toBeLessThan(20);
    // Then each waits for one move to end: 2 at 10/s.
    expect(tookMs[17]).toBeGreaterThan(190);
    expect(tookMs[17]).toBeLessThan(210);
    await terminal.ask('G4P0.01');
    expect(await terminal.status()).toContain('MPos:36.000,');
  });
});

describe('feed hold', () => {
  it('slows down over v²/2a, then stands in Hold:0, and goes on after ~', async () => {
    const terminal = await opened();
    await terminal.ask('G1 X60 F1800');
    await terminal.wait(1000);
    const beginMs = terminal.clock.monotonicMs();
    const begin = terminal.controller.shaftAt(beginMs + 0.09)[0]!;
    await terminal.write('!?');
    await terminal.wait(20);
    expect(terminal.heard.at(-1)!.text).toMatch(/^<Hold:1\|/);
    await terminal.wait(200);
    const report = await terminal.status();
    expect(report).toMatch(/^<Hold:0\|.*FS:0,0/);
    // 30²/(2·360) = 1.25°.
    expect(placeOf(report) - begin).toBeCloseTo(1.25, 1);
    expect(
      Math.abs(terminal.controller.shaftAt(terminal.clock.monotonicMs())[0]! - begin - 1.25),
    ).toBeLessThan(0.01);
    await terminal.write('~');
    await terminal.wait(3000);
    expect(await terminal.status()).toMatch(/^<Idle\|MPos:60.000/);
  });

  it('answers no line while held, and all of them after ~', async () => {
    const terminal = await opened();
    await terminal.ask('G90 G1 X60 F600');
    await terminal.wait(1000);
    await terminal.write('!');
    await terminal.wait(200);
    await terminal.write('G1 X0\n$G\n');
    expect(await terminal.listen(1500)).toEqual([]);
    await terminal.write('~');
    expect(await terminal.listen(100)).toEqual(['ok', '[GC:G1 G54 G17 G21 G90 G94 M5 M9 T0 F600 S0]', 'ok']);
  });

  it('enters Hold:0 from Idle and blocks lines', async () => {
    const terminal = await opened();
    await terminal.write('!');
    expect(await terminal.status()).toMatch(/^<Hold:0\|/);
    await terminal.write('G0 X0\n');
    expect(await terminal.listen(1000)).toEqual([]);
    await terminal.write('~');
    expect(await terminal.listen(100)).toEqual(['ok']);
  });

  it('lengthens a dwell by the hold', async () => {
    const terminal = await opened();
    const startMs = terminal.clock.monotonicMs();
    await terminal.write('G4 P1\n');
    await terminal.wait(500);
    await terminal.write('!');
    await terminal.wait(2000);
    await terminal.write('~');
    await terminal.until(() => terminal.heard.at(-1)!.text === 'ok', 3000);
    expect(terminal.lastAtMs - startMs).toBeGreaterThan(2990);
    expect(terminal.lastAtMs - startMs).toBeLessThan(3060);
  });
});

describe('soft reset', () => {
  it('after Hold:0 keeps the place, raises no alarm and drops the queue', async () => {
    const terminal = await opened();
    await terminal.ask('G90 G1 X60 F1200');
    await terminal.wait(1000);
    await terminal.write('!');
    await terminal.wait(300);
    const held = placeOf(await terminal.status());
    await terminal.write(0x18);
    expect(await terminal.listen(300)).toEqual(['', "Grbl 1.1h ['$' for help]"]);
    const report = await terminal.status();
    expect(report).toMatch(/^<Idle\|/);
    expect(placeOf(report)).toBe(held);
    expect(terminal.controller.poseAt(terminal.clock.monotonicMs()).azimuthDeg).toBeCloseTo(held, 2);
    await terminal.wait(3000);
    expect(placeOf(await terminal.status())).toBe(held);
  });

  it('in motion prints ALARM:3, a false ok for the line under way, the banner and the lock', async () => {
    const terminal = await opened();
    await terminal.ask('G90 G1 X60 F1200');
    await terminal.ask('G1 X0');
    await terminal.write('G4 P0.5\n');
    await terminal.wait(1000);
    const atMs = terminal.clock.monotonicMs();
    await terminal.write(0x18);
    expect(await terminal.listen(800)).toEqual([
      'ALARM:3',
      'ok',
      '',
      "Grbl 1.1h ['$' for help]",
      "[MSG:'$H'|'$X' to unlock]",
    ]);
    const ok = terminal.heard.findLast((heard) => heard.text === 'ok')!;
    expect(ok.atMs - atMs).toBeGreaterThan(500);
    const report = await terminal.status();
    expect(report).toMatch(/^<Alarm\|/);
    // The motor ran on after its last pulse: 20°/s for 20 ms at half speed.
    const shaft = terminal.controller.shaftAt(terminal.clock.monotonicMs())[0]!;
    expect(shaft - placeOf(report)).toBeCloseTo(0.2, 1);
    expect(await terminal.ask('G0 X0')).toEqual(['error:9']);
    expect(await terminal.ask('$J=X1F100')).toEqual(['error:8']);
    expect(await terminal.ask('$X')).toEqual(['[MSG:Caution: Unlocked]', 'ok']);
    expect(await terminal.ask('G1 X0')).toEqual(['error:22']);
    expect(await terminal.ask('G1 X0 F600')).toEqual(['ok']);
  });

  it('confirms nothing falsely when no line was under way', async () => {
    const terminal = await opened();
    await terminal.ask('G1 X60 F1200');
    await terminal.wait(500);
    await terminal.write(0x18);
    expect(await terminal.listen(800)).not.toContain('ok');
  });

  it('keeps what follows it in the same write when at rest', async () => {
    const terminal = await opened();
    await terminal.write('\x18$I\n');
    expect(await terminal.listen(100)).toEqual([
      '',
      "Grbl 1.1h ['$' for help]",
      '[VER:1.1h.20190830:]',
      '[OPT:V,15,128]',
      'ok',
    ]);
  });
});

describe('jog', () => {
  it('refuses other lines, is cancelled by 0x85 within v²/2a, and touches no mode', async () => {
    const terminal = await opened();
    await terminal.ask('$J=G91 X40 F600');
    await terminal.wait(500);
    expect(await terminal.status()).toMatch(/^<Jog\|/);
    expect(await terminal.ask('G0 X0')).toEqual(['error:9']);
    expect(await terminal.ask('$J=G91 X5 F600')).toEqual(['ok']);
    const before = terminal.controller.shaftAt(terminal.clock.monotonicMs())[0]!;
    await terminal.write(0x85);
    await terminal.wait(300);
    const report = await terminal.status();
    expect(report).toMatch(/^<Idle\|/);
    // 10²/(2·360) = 0.139°, to a step of 0.0125° and the byte on the wire.
    expect(Math.abs(placeOf(report) - before - 0.139)).toBeLessThan(0.015);
    expect((await terminal.ask('$G'))[0]).toBe('[GC:G0 G54 G17 G21 G90 G94 M5 M9 T0 F0 S0]');
    await terminal.ask('G91 G0 X1');
    await terminal.ask('G4P0');
    expect(placeOf(await terminal.status())).toBeCloseTo(placeOf(report) + 1, 1);
  });

  it('is cancelled by a hold too, and 0x85 at rest does nothing', async () => {
    const terminal = await opened();
    await terminal.ask('$J=G91 X10 F600');
    await terminal.wait(300);
    await terminal.write('!');
    await terminal.wait(200);
    expect(await terminal.status()).toMatch(/^<Idle\|/);
    await terminal.write(0x85);
    expect(await terminal.ask('')).toEqual(['ok']);
  });

  it('refuses jogs and settings while a G-code move runs, not the modes', async () => {
    const terminal = await opened();
    await terminal.ask('G1 X30 F600');
    await terminal.wait(50);
    for (const line of ['$J=X0 F600', '$$', '$#', '$100=80']) {
      expect(await terminal.ask(line)).toEqual(['error:8']);
    }
    expect((await terminal.ask('$G')).at(-1)).toBe('ok');
  });
});

describe('door, check, sleep', () => {
  it('slows down behind an opened door and goes on when it is closed', async () => {
    const terminal = await opened();
    await terminal.ask('G90 G1 X40 F600');
    await terminal.wait(720);
    await terminal.write(0x84);
    await terminal.write('?');
    const heard = await terminal.listen(15);
    expect(heard[0]).toBe('[MSG:Check Door]');
    expect(heard[1]).toMatch(/^<Door:2\|/);
    await terminal.wait(300);
    expect(await terminal.status()).toMatch(/^<Door:0\|/);
    terminal.controller.setDoor(true);
    expect(await terminal.status()).toMatch(/^<Door:1\|.*Pn:D/);
    await terminal.write('~');
    await terminal.wait(100);
    expect(await terminal.status()).toMatch(/^<Door:1\|/);
    terminal.controller.setDoor(false);
    await terminal.write('~');
    await terminal.wait(100);
    expect(await terminal.status()).toMatch(/^<Run\|/);
  });

  it('checks lines without moving, and resets when check mode ends', async () => {
    const terminal = await opened();
    expect(await terminal.ask('$C')).toEqual(['[MSG:Enabled]', 'ok']);
    expect(await terminal.status()).toMatch(/^<Check\|/);
    expect(await terminal.ask('G1 X100 F500')).toEqual(['ok']);
    expect(await terminal.ask('G1 X9 Q3')).toEqual(['error:20']);
    expect(placeOf(await terminal.status())).toBe(0);
    await terminal.write('$C\n');
    expect(await terminal.listen(100)).toEqual(['[MSG:Disabled]', 'ok', '', "Grbl 1.1h ['$' for help]"]);
  });

  it('sleeps until a reset, which locks', async () => {
    const terminal = await opened();
    await terminal.write('$SLP\n');
    expect(await terminal.listen(50)).toEqual(['ok', '[MSG:Sleeping]']);
    expect(await terminal.status()).toMatch(/^<Sleep\|/);
    await terminal.write('G0X1\n');
    expect(await terminal.listen(500)).toEqual([]);
    await terminal.write(0x18);
    expect(await terminal.listen(100)).toEqual(['', "Grbl 1.1h ['$' for help]", "[MSG:'$H'|'$X' to unlock]"]);
  });
});

describe('opening the port', () => {
  it('resets a board with a reset line: the counter is zero, the shaft stays', async () => {
    const terminal = await opened({ onConnect: 'restarts' });
    await terminal.ask('G91 G1 X60 F600');
    await terminal.wait(1500);
    await terminal.link.close();
    const before = terminal.heard.length;
    await terminal.open();
    expect(terminal.heard.slice(before).map((heard) => heard.text)).toEqual(['', "Grbl 1.1h ['$' for help]"]);
    expect(placeOf(await terminal.status())).toBe(0);
    expect(terminal.controller.shaftAt(terminal.clock.monotonicMs())[0]).toBeGreaterThan(14);
  });

  it('lets the move go on otherwise', async () => {
    const terminal = await opened();
    await terminal.ask('G91 G1 X60 F600');
    await terminal.wait(1000);
    await terminal.link.close();
    await terminal.wait(2000);
    await terminal.open();
    expect(await terminal.status()).toMatch(/^<Run\|MPos:3\d\./);
    await terminal.wait(3100);
    expect(await terminal.status()).toMatch(/^<Idle\|MPos:60.000/);
  });

  it('loses everything before the banner of a slow boot loader', async () => {
    const terminal = new ControllerTerminal({ onConnect: 'restarts', bootMs: 1600 });
    await terminal.open(0);
    await terminal.write('?$I\n');
    expect(await terminal.listen(1590)).toEqual([]);
    expect(await terminal.listen(100)).toEqual(['', "Grbl 1.1h ['$' for help]"]);
  });
});
