// The bench in one piece, in virtual time: what the analyzer measures follows where the controller has turned
// the mast, what is mounted, and what strikes.
import { describe, expect, it } from 'vitest';
import type { Link } from '../../../drivers/link/link.ts';
import { type BenchDescription, SimulatedBench } from '../../../mocks/simulated-bench.ts';
import { SimulatedClock } from '../../../mocks/simulated-clock.ts';

interface Rig {
  clock: SimulatedClock;
  bench: SimulatedBench;
  analyzer: Link;
  positioner: Link;
  ask: (link: Link, text: string, isWhole: (heard: string) => boolean) => Promise<string>;
}

async function rig(description: BenchDescription = {}): Promise<Rig> {
  const clock = new SimulatedClock();
  const bench = new SimulatedBench(clock, description);
  const ports = bench.listenInMemory();
  const analyzer = ports.analyzer.link();
  const positioner = ports.positioner.link();
  await analyzer.open();
  await positioner.open();
  await clock.run(clock.sleep(100));
  const ask = async (link: Link, text: string, isWhole: (heard: string) => boolean): Promise<string> => {
    let heard = '';
    const listening = link.received$.subscribe((bytes) => {
      heard += Buffer.from(bytes).toString('latin1');
    });
    await link.write(Buffer.from(text));
    for (let waited = 0; !isWhole(heard) && waited < 60_000; waited += 5) await clock.run(clock.sleep(5));
    listening.unsubscribe();
    return heard;
  };
  return { clock, bench, analyzer, positioner, ask };
}

const isLine = (heard: string): boolean => heard.endsWith('\n');

async function turnTo({ ask, positioner }: Rig, azimuth: number): Promise<void> {
  await ask(positioner, `G90 G0 X${azimuth}\nG4 P0.01\n`, (heard) => (heard.match(/ok/g) ?? []).length === 2);
}

/** S21 of one point at 868 MHz. */
async function transmission({ ask, analyzer }: Rig): Promise<number> {
  const setUp = ':SENS:FREQ:STAR 868e6;:SENS:FREQ:STOP 868e6;:SENS:SWE:POIN 1;:CALC:PAR1:DEF S21\n';
  await analyzer.write(Buffer.from(setUp));
  await analyzer.write(Buffer.from(':INIT:CONT OFF;:FORM:DATA ASC;:INIT:IMM\n'));
  const heard = await ask(analyzer, '*OPC?;:CALC:DATA:SDAT?\n', isLine);
  const [re, im] = heard.split(';').at(-1)!.split(',').map(Number);
  return Math.hypot(re!, im!);
}

const quiet: BenchDescription = {
  scene: { antennas: { aut: { kind: 'cardioid' } }, noise: { snrDb: Number.POSITIVE_INFINITY } },
};

describe('SimulatedBench', () => {
  it('measures the antenna from where the controller has turned it', async () => {
    const r = await rig(quiet);
    const ahead = await transmission(r);
    await turnTo(r, 90);
    // A cardioid has half the field, (1 + cos 90°)/2, broadside.
    expect((await transmission(r)) / ahead).toBeCloseTo(0.5, 3);
    await turnTo(r, 60);
    expect((await transmission(r)) / ahead).toBeCloseTo(0.75, 3);
  });

  it('sees lost steps although the controller reports its target', async () => {
    const r = await rig(quiet);
    const ahead = await transmission(r);
    r.bench.controller.loseSteps('X', -30);
    await turnTo(r, 90);
    expect((await transmission(r)) / ahead).toBeCloseTo(0.75, 3);
    expect(await r.ask(r.positioner, '?', isLine)).toContain('MPos:90.000,');
  });

  it('swaps the antenna on the mast', async () => {
    const r = await rig({
      scene: {
        antennas: { aut: { kind: 'isotropic', gainDbi: 6 }, reference: { kind: 'isotropic', gainDbi: 0 } },
        noise: { snrDb: Number.POSITIVE_INFINITY },
      },
    });
    const aut = await transmission(r);
    r.bench.mount('reference');
    expect(20 * Math.log10(aut / (await transmission(r)))).toBeCloseTo(6, 6);
    expect(r.bench.truth().mounted).toBe('reference');
    expect(r.bench.truth({ which: 'aut' }).frequencies[0]!.gainDbi).toBeCloseTo(6, 9);
  });

  it('repeats itself for the same seed, noise and all, and not for another', async () => {
    const measure = async (seed: number): Promise<number> =>
      transmission(await rig({ scene: { seed, noise: { snrDb: 20 } } }));
    const first = await measure(5);
    expect(await measure(5)).toBe(first);
    expect(await measure(6)).not.toBe(first);
  });

  it('cuts the links of the device a fault concerns', async () => {
    const r = await rig();
    r.bench.faults.inject('analyzer-link-drop');
    await r.clock.run(r.clock.sleep(10));
    expect(r.analyzer.isOpen).toBe(false);
    expect(r.positioner.isOpen).toBe(true);
    await r.analyzer.open();
    expect(await r.ask(r.analyzer, '*IDN?\n', isLine)).toContain(',');
  });

  it('cuts a block short, loses power, and answers nonsense when told to', async () => {
    const r = await rig();
    expect(r.bench.faults.injectAfter('garbage-answer', 2)).toBe(true);
    const identity = await r.ask(r.analyzer, '*IDN?\n', isLine);
    expect(await r.ask(r.analyzer, '*IDN?\n', isLine)).not.toBe(identity);
    expect(await r.ask(r.analyzer, '*IDN?\n', isLine)).toBe(identity);
    r.bench.faults.inject('power-cycle');
    await r.clock.run(r.clock.sleep(10));
    expect(r.analyzer.isOpen).toBe(false);
  });

  it('takes no visitors once it is closed', async () => {
    const r = await rig();
    await r.bench.close();
    await r.clock.run(r.clock.sleep(10));
    expect(r.positioner.isOpen).toBe(false);
    expect(r.analyzer.isOpen).toBe(false);
    await expect(r.analyzer.open()).rejects.toThrow('nobody listens');
  });
});
