// The serial link on a real pseudo-terminal with the real binding: bytes, who closed, and the traps of the
// binding; then the positioner's whole job over it, against the simulated controller at the other end.
import { afterEach, beforeEach, describe, expect } from 'vitest';
import { SystemClock } from '../../drivers/clock.ts';
import type { DriverError } from '../../drivers/errors.ts';
import type { LinkClosed } from '../../drivers/link/link.ts';
import { SerialLink } from '../../drivers/link/serial.ts';
import { GcodePositioner } from '../../drivers/positioner/gcode-positioner.ts';
import { AcceleratedClock } from '../../mocks/accelerated-clock.ts';
import { SimulatedBench } from '../../mocks/simulated-bench.ts';
import { fakeAxis } from '../support/fake-devices.ts';
import { itWithTool } from '../support/outside-tool.ts';
import { missingSocat, type PtyPair, ptyPair } from '../support/pty-pair.ts';

const it = itWithTool(missingSocat());
const clock = new SystemClock();
const baud = 115_200;

async function codeOf(work: Promise<unknown>): Promise<unknown> {
  return work.then(
    () => 'done',
    (error: unknown) => (error as DriverError).code,
  );
}

async function until(isReached: () => boolean): Promise<void> {
  const deadlineMs = clock.monotonicMs() + 10_000;
  while (!isReached()) {
    if (clock.monotonicMs() > deadlineMs) throw new Error('not reached within 10 s');
    await clock.sleep(2);
  }
}

describe('a serial link', () => {
  let pair: PtyPair;
  let near: SerialLink;
  let far: SerialLink;

  beforeEach(async () => {
    if (missingSocat()) return;
    pair = await ptyPair();
    near = new SerialLink({ path: pair.near, baud }, clock);
    far = new SerialLink({ path: pair.far, baud }, clock);
  });

  afterEach(async () => {
    if (missingSocat()) return;
    await near.close();
    await far.close();
    await pair.remove();
  });

  it('carries bytes both ways, in order, every value', async () => {
    await near.open();
    await far.open();
    const atFar: number[] = [];
    const atNear: number[] = [];
    far.received$.subscribe((bytes) => atFar.push(...bytes));
    near.received$.subscribe((bytes) => atNear.push(...bytes));
    const block = Uint8Array.from({ length: 20_000 }, (_, i) => (i * 7 + (i >> 8)) & 0xff);
    for (let at = 0; at < block.length; at += 1000) await near.write(block.subarray(at, at + 1000));
    await far.write(Uint8Array.of(0, 10, 13, 17, 19, 24, 26, 127, 255));
    await until(() => atFar.length === block.length && atNear.length === 9);
    expect(Buffer.compare(Buffer.from(atFar), Buffer.from(block))).toBe(0);
    expect(atNear).toEqual([0, 10, 13, 17, 19, 24, 26, 127, 255]);
  });

  it('is opened by one alone', async () => {
    await near.open();
    const second = new SerialLink({ path: pair.near, baud }, clock);
    expect(await codeOf(second.open())).toBe('LINK_OPEN_FAILED');
    expect(second.isOpen).toBe(false);
  });

  it('refuses a device that is not there, and writes while closed', async () => {
    const absent = new SerialLink({ path: `${pair.near}-absent`, baud }, clock);
    expect(await codeOf(absent.open())).toBe('LINK_OPEN_FAILED');
    expect(await codeOf(absent.write(Uint8Array.of(1)))).toBe('LINK_CLOSED');
    await near.open();
    await near.close();
    expect(await codeOf(near.write(Uint8Array.of(1)))).toBe('LINK_CLOSED');
  });

  it('says local when we close it', async () => {
    const news: LinkClosed[] = [];
    near.closed$.subscribe((one) => news.push(one));
    await near.open();
    await near.close();
    await near.close();
    expect(news).toEqual([{ by: 'local' }]);
  });

  it('notices that the device was unplugged, and opens again when it is back', async () => {
    const news: LinkClosed[] = [];
    near.closed$.subscribe((one) => news.push(one));
    await near.open();
    await pair.unplug();
    await until(() => news.length > 0);
    expect(news.map((one) => one.by)).toEqual(['remote']);
    expect(near.isOpen).toBe(false);
    await pair.plug();
    await near.open();
    await far.open();
    const heard: number[] = [];
    far.received$.subscribe((bytes) => heard.push(...bytes));
    await near.write(Uint8Array.of(42));
    await until(() => heard.length === 1);
  });

  it('does not wait for ever where the other end takes nothing', async () => {
    await near.open();
    // Nobody reads the far end: the kernel's buffers fill, and then the write must end by itself.
    let outcome: unknown = 'done';
    for (let count = 0; outcome === 'done' && count < 40; count += 1) {
      outcome = await codeOf(near.write(new Uint8Array(65_536)));
    }
    expect(outcome).toBe('LINK_TIMEOUT');
    await near.close();
    expect(near.isOpen).toBe(false);
  });

  it('drives a positioner: identify, home, move, stop', async () => {
    const bench = new SimulatedBench(new AcceleratedClock(clock, 10), {
      positioner: { settings: { 110: 1200, 120: 40 } },
    });
    await far.open();
    bench.controller.connect(far);
    const positioner = new GcodePositioner(near, clock, { axes: [fakeAxis('none')] });
    const identity = await positioner.identify();
    expect(identity.family).toBe('realtime-status');
    await positioner.home();
    const arrival = await positioner.moveTo({ azimuth: 20 });
    expect(arrival.position['azimuth']).toBeCloseTo(20, 1);
    const move = positioner.moveTo({ azimuth: 150 }).catch((error: unknown) => error);
    await until(() => bench.controller.state === 'Run');
    const report = await positioner.stop();
    expect(await move).toMatchObject({ code: 'POSITIONER_STOPPED' });
    expect(report.position['azimuth']).toBeLessThan(150);
    expect(bench.controller.state).toBe('Idle');
    await positioner.close();
    await bench.close();
  });
});
