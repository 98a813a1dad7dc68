import { describe, expect, it } from 'vitest';
import type { Link } from '../../../../drivers/link/link.ts';
import { MemoryPort } from '../../../../drivers/link/memory.ts';
import type { SenderEvent } from '../../../../drivers/positioner/gcode-events.ts';
import { GcodeSender } from '../../../../drivers/positioner/gcode-sender.ts';
import { SimulatedClock } from '../../../../mocks/simulated-clock.ts';

const withinMs = 1_000;

/** A sender in step, over a wire whose other end is the test itself. */
async function makeWire() {
  const clock = new SimulatedClock();
  const port = new MemoryPort(clock);
  const heard: string[] = [];
  const events: SenderEvent[] = [];
  let far: Link | undefined;
  port.listen((visitor) => {
    far = visitor;
    visitor.received$.subscribe((bytes) => heard.push(String.fromCharCode(...bytes)));
  });
  const link = port.link();
  const sender = new GcodeSender(link, clock);
  sender.events$.subscribe((event) => events.push(event));
  await link.open();
  const say = (text: string): void => void far?.write(new TextEncoder().encode(text));
  const hangUp = (): void => void far?.close();
  const wait = (ms: number): Promise<void> => clock.run(clock.sleep(ms));
  const start = sender.resync();
  start.catch(() => {});
  await wait(1);
  say('error:1\n[GC:G0 F0]\nok\n');
  await clock.run(start);
  heard.length = 0;
  return { clock, sender, heard, events, say, hangUp, wait };
}

describe('GcodeSender', () => {
  it('sends the next line only when the one before is answered', async () => {
    const { clock, sender, heard, say, wait } = await makeWire();
    const first = sender.line('G90', { withinMs });
    const second = sender.line('$I', { withinMs });
    await wait(10);
    expect(heard).toEqual(['G90\n']);
    say('ok\n');
    await wait(10);
    expect(heard).toEqual(['G90\n', '$I\n']);
    say('[VER:1.1h:]\n<Idle|MPos:0.000>\nok\n');
    expect(await clock.run(first)).toEqual([{ kind: 'ok' }]);
    // A report in between is an event, no part of the answer.
    expect(await clock.run(second)).toEqual([{ kind: 'data', key: 'VER', value: '1.1h:' }, { kind: 'ok' }]);
  });

  it('lets urgent bytes overtake, in the turn of the call', async () => {
    const { clock, sender, heard, say, wait } = await makeWire();
    const line = sender.line('G4 P9', { withinMs });
    await wait(10);
    sender.urgent(0x21, 0x3f);
    await wait(0);
    expect(heard).toEqual(['G4 P9\n', '!?']);
    say('ok\n');
    await clock.run(line);
  });

  it('agrees anew after an answer that never came: the late one counts for nothing', async () => {
    const { clock, sender, heard, say, wait } = await makeWire();
    await expect(clock.run(sender.line('G4 P2', { withinMs }))).rejects.toMatchObject({
      code: 'POSITIONER_NOT_ANSWERING',
      facts: { line: 'G4 P2' },
    });
    const next = sender.line('G90', { withinMs });
    await wait(10);
    expect(heard.at(-1)).toBe('#\n$G\n');
    say('ok\n');
    await wait(10);
    expect(heard.at(-1)).toBe('#\n$G\n');
    say('error:1\n[GC:G0 G54 F60 S0]\nok\n');
    await wait(10);
    expect(heard.at(-1)).toBe('G90\n');
    say('error:25\n');
    await expect(clock.run(next)).rejects.toMatchObject({
      code: 'POSITIONER_COMMAND_REFUSED',
      facts: { error: 25 },
    });
  });

  it('tells the answers to a second attempt at agreeing from those to the first', async () => {
    const { clock, sender, heard, say, wait } = await makeWire();
    const agreeing = sender.resync();
    const next = sender.line('G90', { withinMs });
    await wait(1_600);
    expect(heard).toEqual(['#\n$G\n', '#\n#\n$G\n']);
    say('error:1\n[GC:F0]\nok\n');
    await wait(600);
    expect(heard.at(-1)).toBe('#\n#\n$G\n');
    say('error:1\nerror:1\n[GC:F0]\nok\n');
    await clock.run(agreeing);
    await wait(10);
    expect(heard.at(-1)).toBe('G90\n');
    say('ok\n');
    expect(await clock.run(next)).toEqual([{ kind: 'ok' }]);
  });

  it('does not take a parser state that was owed for the one it asked for to agree', async () => {
    const { clock, sender, heard, say, wait } = await makeWire();
    const owed = sender.line('$G', { withinMs: 100 });
    await expect(clock.run(owed)).rejects.toMatchObject({ code: 'POSITIONER_NOT_ANSWERING' });
    const next = sender.line('G90', { withinMs });
    await wait(10);
    say('[GC:F0]\nok\n');
    await wait(50);
    expect(heard.at(-1)).toBe('#\n$G\n');
    say('error:1\n[GC:F0]\nok\n');
    await wait(10);
    expect(heard.at(-1)).toBe('G90\n');
    say('ok\n');
    expect(await clock.run(next)).toEqual([{ kind: 'ok' }]);
  });

  it('is in step by two answers and a pause where no parser state is printed', async () => {
    const { clock, sender, heard, say, wait } = await makeWire();
    const agreeing = sender.resync();
    await wait(10);
    say('error:1\nerror:3\n');
    await clock.run(agreeing);
    const line = sender.line('G90', { withinMs });
    await wait(10);
    expect(heard.at(-1)).toBe('G90\n');
    say('ok\n');
    await clock.run(line);
  });

  it('asks a controller that goes on refusing for its parser state before the next line', async () => {
    const { clock, sender, heard, say, wait } = await makeWire();
    const refused = sender.line('G0 Q5', { withinMs });
    const next = sender.line('G90', { withinMs });
    await wait(10);
    say('error:36\n');
    await expect(clock.run(refused)).rejects.toMatchObject({ facts: { error: 36 } });
    await wait(10);
    expect(heard.at(-1)).toBe('#\n$G\n');
    say('error:36\n[GC:G0 F0]\nok\n');
    await wait(10);
    say('ok\n');
    await clock.run(next);
  });

  it('rejects the waiting line on alarm; the ok that follows belongs to nobody', async () => {
    const { clock, sender, events, say, wait } = await makeWire();
    const line = sender.line('$H', { withinMs: 60_000 });
    await wait(10);
    say("ALARM:9\nok\n\nGrbl 1.1h ['$' for help]\n");
    await expect(clock.run(line)).rejects.toMatchObject({ code: 'POSITIONER_ALARM', facts: { alarm: 9 } });
    await wait(10);
    expect(events.map((event) => event.kind)).toEqual(['alarm', 'stray', 'stray', 'restart']);
  });

  it('rejects the waiting line on a banner, and tells an unasked one from an answer to a reset', async () => {
    const { clock, sender, events, say, wait } = await makeWire();
    const line = sender.line('G90', { withinMs });
    await wait(10);
    say("\r\nGrbl 1.1h ['$' for help]\r\n");
    await expect(clock.run(line)).rejects.toMatchObject({ code: 'POSITIONER_RESTARTED' });
    const reset = sender.reset(1_000);
    await wait(10);
    say("\r\nGrblHAL 1.1f ['$' or '$HELP' for help]\r\n");
    expect(await clock.run(reset)).toContain('GrblHAL');
    expect(events.filter((event) => event.kind === 'restart').map((event) => event.asked)).toEqual([
      false,
      true,
    ]);
  });

  it('rejects everything that waits when the wire closes', async () => {
    const { clock, sender, hangUp, wait } = await makeWire();
    const line = sender.line('G90', { withinMs });
    const behind = sender.line('G91', { withinMs });
    const report = sender.report();
    for (const work of [line, behind, report]) work.catch(() => {});
    await wait(10);
    hangUp();
    for (const work of [line, behind, report])
      await expect(clock.run<unknown>(work)).rejects.toMatchObject({ code: 'LINK_CLOSED' });
  });

  it('gives an aborted line its reason and stays usable', async () => {
    const { clock, sender, say, wait } = await makeWire();
    const aborted = new AbortController();
    const line = sender.line('G4 P9', { withinMs, signal: aborted.signal });
    line.catch(() => {});
    await wait(10);
    const why = new Error('enough');
    aborted.abort(why);
    await expect(clock.run(line)).rejects.toBe(why);
    const next = sender.line('G90', { withinMs });
    await wait(10);
    say('ok\nerror:1\n[GC:F0]\nok\n');
    await wait(10);
    say('ok\n');
    expect(await clock.run(next)).toEqual([{ kind: 'ok' }]);
  });

  it('asks three times for a report, then says so', async () => {
    const { clock, sender, heard } = await makeWire();
    await expect(clock.run(sender.report())).rejects.toMatchObject({ code: 'POSITIONER_NOT_ANSWERING' });
    expect(heard.join('')).toBe('???');
  });
});
