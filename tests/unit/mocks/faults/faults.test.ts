// Each fault does what its entry says, by name, by time and by count, and a seed repeats a plan.
import { describe, expect, it } from 'vitest';
import { drawFaults, FaultInjector } from '../../../../mocks/faults/fault-injector.ts';
import { faults } from '../../../../mocks/faults/fault-table.ts';
import { InstrumentHooks } from '../../../../mocks/faults/instrument-hooks.ts';
import { stream } from '../../../../mocks/random.ts';
import { ControllerTerminal } from '../../../support/controller-terminal.ts';

interface Bench {
  terminal: ControllerTerminal;
  injector: FaultInjector;
  hooks: InstrumentHooks;
  calls: string[];
}

async function bench(seed = 1): Promise<Bench> {
  const terminal = new ControllerTerminal();
  const calls: string[] = [];
  const hooks = new InstrumentHooks(
    () => terminal.clock.monotonicMs(),
    () => injector.answered('analyzer'),
  );
  const injector = new FaultInjector(terminal.clock, {
    controller: terminal.controller,
    hooks,
    powerCycleInstrument: () => calls.push('power'),
    dropInstrumentVisitors: () => calls.push('drop'),
    random: stream(seed, 'faults'),
  });
  await terminal.open();
  return { terminal, injector, hooks, calls };
}

const azimuthOf = ({ terminal }: Bench): number =>
  terminal.controller.poseAt(terminal.clock.monotonicMs()).azimuthDeg;

describe('faults of the positioner', () => {
  it('drops the link while the move goes on', async () => {
    const b = await bench();
    await b.terminal.ask('G1 X30 F600');
    let closedBy = '';
    b.terminal.link.closed$.subscribe((news) => {
      closedBy = news.by;
    });
    b.injector.inject('positioner-link-drop');
    await b.terminal.wait(4000);
    expect(closedBy).toBe('remote');
    expect(azimuthOf(b)).toBeCloseTo(30, 9);
  });

  it('loses one ok, and holds one back', async () => {
    const b = await bench();
    b.injector.inject('lost-ok');
    await b.terminal.write('\n\n');
    expect(await b.terminal.listen(200)).toEqual(['ok']);
    b.injector.inject('late-ok');
    await b.terminal.write('\n');
    expect(await b.terminal.listen(400)).toEqual([]);
    expect(await b.terminal.listen(3000)).toEqual(['ok']);
  });

  it('restarts, alarms and holds', async () => {
    const b = await bench();
    await b.terminal.ask('G0 X5');
    await b.terminal.ask('G4 P0');
    b.injector.inject('hold-pressed');
    expect(await b.terminal.status()).toMatch(/^<Hold:0/);
    b.injector.inject('restart');
    expect(await b.terminal.listen(100)).toEqual(['', "Grbl 1.1h ['$' for help]"]);
    expect(await b.terminal.status()).toContain('MPos:0.000,');
    expect(azimuthOf(b)).toBeCloseTo(5, 9);
    b.injector.inject('alarm');
    expect(await b.terminal.listen(700)).toEqual(['ALARM:1', '[MSG:Reset to continue]']);
  });

  it('damages one status report', async () => {
    const b = await bench();
    b.injector.inject('garbage-status');
    await b.terminal.write('?');
    const damaged = (await b.terminal.listen(100)).join();
    expect(damaged).not.toMatch(/^<Idle\|MPos:0\.000,0\.000,0\.000\|FS:0,0\|WCO:0\.000,0\.000,0\.000>$/);
    expect(damaged.length).toBeGreaterThan(0);
    expect(await b.terminal.status()).toMatch(/^<Idle\|MPos:0\.000,0\.000,0\.000\|/);
  });

  it('loses steps and stalls behind the back of the controller', async () => {
    const b = await bench();
    b.injector.inject('step-loss');
    const lost = azimuthOf(b);
    expect(Math.abs(lost)).toBeGreaterThanOrEqual(0.5);
    expect(Math.abs(lost)).toBeLessThanOrEqual(3);
    expect(await b.terminal.status()).toContain('MPos:0.000,');
    await b.terminal.ask('G1 X60 F600');
    await b.terminal.wait(1000);
    b.injector.inject('stall');
    const stuck = azimuthOf(b);
    await b.terminal.wait(1000);
    expect(azimuthOf(b)).toBeCloseTo(stuck, 9);
    await b.terminal.ask('G4 P0');
    expect(await b.terminal.status()).toContain('MPos:60.000,');
    // 2 s at 10°/s are missing.
    expect(azimuthOf(b)).toBeCloseTo(60 + lost - 20, 6);
  });
});

describe('faults of the analyzer', () => {
  const answer = Buffer.from('+1.5\n');
  const block = Buffer.concat([Buffer.from('#18'), Buffer.alloc(8), Buffer.from('\n')]);

  it('replaces one answer by nonsense that ends like an answer', async () => {
    const { injector, hooks } = await bench();
    injector.inject('garbage-answer');
    const nonsense = hooks.onAnswer(answer)!;
    expect(Buffer.compare(Buffer.from(nonsense), answer)).not.toBe(0);
    expect(nonsense.at(-1)).toBe(0x0a);
    expect(hooks.onAnswer(answer)).toBe(answer);
  });

  it('breaks off the next block and leaves other answers alone', async () => {
    const { injector, hooks } = await bench();
    injector.inject('truncated-block');
    expect(hooks.onAnswer(answer)).toBe(answer);
    const broken = hooks.onAnswer(block)!;
    expect(broken.length).toBeLessThan(block.length);
    expect(broken[0]).toBe(0x23);
    expect(hooks.onAnswer(block)).toBe(block);
  });

  it('delays, hangs, loses power and link', async () => {
    const { injector, hooks, terminal, calls } = await bench();
    injector.inject('late-answer');
    expect(hooks.delayAnswerMs()).toBeGreaterThanOrEqual(2000);
    expect(hooks.delayAnswerMs()).toBe(0);
    injector.inject('hang');
    expect(hooks.onMessage()).toBe('lose');
    await terminal.wait(60_001);
    expect(hooks.onMessage()).toBe('run');
    injector.inject('power-cycle');
    injector.inject('analyzer-link-drop');
    expect(calls).toEqual(['power', 'drop']);
  });

  it('makes one sweep no numbers, and another one loud in a tenth of its points', async () => {
    const { injector, hooks } = await bench();
    injector.inject('nan-block');
    injector.inject('noise-burst');
    const traces = (): Map<'S21', Float64Array> => new Map([['S21', new Float64Array(400).fill(0.01)]]);
    const first = traces();
    hooks.onTraces(first);
    expect(first.get('S21')!.every(Number.isNaN)).toBe(true);
    const second = traces();
    hooks.onTraces(second);
    const changed = second.get('S21')!.filter((value) => value !== 0.01);
    expect(changed).toHaveLength(40);
    const third = traces();
    hooks.onTraces(third);
    expect(third.get('S21')!.every((value) => value === 0.01)).toBe(true);
  });
});

describe('when faults strike', () => {
  it('at moments of a plan, and keeps a journal', async () => {
    const { injector, terminal } = await bench();
    injector.follow([
      { name: 'hold-pressed', atMs: 500 },
      { name: 'restart', atMs: 900 },
    ]);
    await terminal.wait(600);
    expect(await terminal.status()).toMatch(/^<Hold:0/);
    await terminal.wait(500);
    expect(injector.journal).toEqual([
      { name: 'hold-pressed', atMs: 500 },
      { name: 'restart', atMs: 900 },
    ]);
  });

  it('after so many answers of the device concerned', async () => {
    const { injector, terminal, hooks } = await bench();
    injector.injectAfter('hold-pressed', 3);
    injector.injectAfter('power-cycle', 2);
    await terminal.ask('');
    await terminal.ask('');
    expect(injector.journal).toEqual([]);
    hooks.onAnswer(Uint8Array.of(1));
    hooks.onAnswer(Uint8Array.of(1));
    await terminal.ask('');
    expect(injector.journal.map((entry) => entry.name)).toEqual(['power-cycle', 'hold-pressed']);
  });

  it('refuses names it does not know', async () => {
    const { injector } = await bench();
    expect(injector.inject('gremlins')).toBe(false);
    expect(injector.injectAfter('gremlins', 1)).toBe(false);
  });

  it('as the seed draws them: the same for the same seed, another plan for another', () => {
    const options = { count: 30, fromMs: 1000, toMs: 9000 };
    const plan = drawFaults(7, options);
    expect(drawFaults(7, options)).toEqual(plan);
    expect(drawFaults(8, options)).not.toEqual(plan);
    expect(
      plan.every(({ atMs }, i) => atMs >= 1000 && atMs < 9000 && (i === 0 || plan[i - 1]!.atMs <= atMs)),
    ).toBe(true);
    expect(new Set(faults.map((fault) => fault.name)).size).toBe(faults.length);
  });

  it('with the same sizes for the same seed', async () => {
    const sizes = async (seed: number): Promise<number> => {
      const b = await bench(seed);
      b.injector.inject('step-loss');
      return azimuthOf(b);
    };
    expect(await sizes(3)).toBe(await sizes(3));
    expect(await sizes(3)).not.toBe(await sizes(4));
  });
});
