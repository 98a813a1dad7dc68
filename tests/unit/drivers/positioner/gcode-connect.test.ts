import { describe, expect, it } from 'vitest';
import { azimuth, codeOf, elevation, failureOf, makeRig } from '../../../support/positioner-rig.ts';

describe('identify', () => {
  it('tells who answers, sets the overrides, and writes no setting', async () => {
    const { clock, controller, positioner } = makeRig();
    expect(await clock.run(positioner.identify())).toEqual({
      family: 'realtime-status',
      firmware: '1.1h.20190830',
      options: 'V,15,128',
    });
    expect(controller.urgent.map(({ byte }) => byte)).toContain(0x90);
    expect(controller.urgent.map(({ byte }) => byte)).not.toContain(0x18);
    expect(controller.lines.filter((line) => /^\$\d/.test(line))).toEqual([]);
    expect(positioner.referenceValid).toBe(false);
  });

  it.each([
    ['a board without a bootloader', 30, ''],
    ['a bootloader that swallows 1.6 s', 1_600, ''],
    ['a boot of several seconds behind junk', 5_500, '\u00ff\u0000<garbage|\r\n~~ boot v0 ~~\r\n<Id'],
  ])('rides out %s', async (_what, bootMs, junk) => {
    const { clock, positioner } = makeRig({ resetsOnOpen: { bootMs, junk } });
    const identity = await clock.run(positioner.identify());
    expect(identity.firmware).toBe('1.1h.20190830');
    await clock.run(positioner.home());
    expect((await clock.run(positioner.moveTo({ azimuth: 20 }))).position['azimuth']).toBe(20);
  });

  it.each([2, 4, 6])('takes a controller of %i axes', async (axisCount) => {
    const { clock, positioner } = makeRig({ axisCount });
    await clock.run(positioner.identify().then(() => positioner.home()));
    const arrival = await clock.run(positioner.moveTo({ azimuth: 20, elevation: 30 }));
    expect(arrival.position).toEqual({ azimuth: 20, elevation: 30 });
  });

  it('finds its axes by the letters that the controller tells', async () => {
    const axes = [{ ...azimuth, word: 'C' }];
    const { clock, positioner } = makeRig(
      { axisCount: 4, startAt: [1, 2, 3, 47], identity: ['[VER:1.1f.20260817:]', '[AXS:4:XYZC]'] },
      { axes },
    );
    await clock.run(positioner.identify());
    expect(await clock.run(positioner.readPosition())).toEqual({ azimuth: 47 });
  });

  it('takes work positions, once their offset has been heard', async () => {
    const { clock, positioner } = makeRig({ reportsWork: true, offset: [-5, 2, 0], startAt: [10, 0, 0] });
    await clock.run(positioner.identify().then(() => positioner.home()));
    expect(await clock.run(positioner.readPosition())).toEqual({ azimuth: 10, elevation: 0 });
    expect((await clock.run(positioner.moveTo({ azimuth: 40 }))).position['azimuth']).toBe(40);
  });

  it('takes settings in any order, reports that come unasked, and bytes in pieces', async () => {
    const { clock, positioner } = makeRig(
      { settingsReversed: true, autoReportMs: 90 },
      {},
      { latencyMs: 1, cut: (bytes) => Array.from(bytes, (_byte, at) => bytes.slice(at, at + 1)) },
    );
    await clock.run(positioner.identify().then(() => positioner.home()));
    expect((await clock.run(positioner.moveTo({ azimuth: 5 }))).position['azimuth']).toBe(5);
  });

  it.each([
    ['motors off between points', { 1: '25' }, '$1'],
    ['reports in inches', { 13: '1' }, '$13'],
    ['laser mode', { 32: '1' }, '$32'],
    ['no rate', { 110: '0.000' }, '$110'],
    ['half a step beyond the tolerance', { 101: '20.000' }, '$101'],
  ])('refuses %s', async (_what, settings, setting) => {
    const { clock, positioner } = makeRig({ settings });
    expect(await failureOf(clock, positioner.identify())).toMatchObject({
      code: 'POSITIONER_UNSAFE_SETTING',
      facts: { setting },
    });
  });

  it('lets motors go idle that a mask keeps on, and only those', async () => {
    const kept = makeRig({ settings: { 1: '25', 37: '3' } });
    await kept.clock.run(kept.positioner.identify());
    const oneOnly = makeRig({ settings: { 1: '25', 37: '1' } });
    expect(await codeOf(oneOnly.clock, oneOnly.positioner.identify())).toBe('POSITIONER_UNSAFE_SETTING');
  });

  it('wants homing switched on where an axis has a switch', async () => {
    const axes = [{ ...azimuth, homing: 'switch' as const }];
    const { clock, positioner } = makeRig({ settings: { 22: '0' } }, { axes });
    expect(await failureOf(clock, positioner.identify())).toMatchObject({ facts: { setting: '$22' } });
  });

  it('reads settings again when a line of them was damaged, and says which are missing', async () => {
    const { clock, controller, positioner } = makeRig();
    let damaged = 0;
    controller.spoil = (text) => (text.startsWith('$110=') && damaged++ === 0 ? '$11\u00ff=1800.000' : text);
    await clock.run(positioner.identify());
    expect(damaged).toBe(2);
    const other = makeRig();
    other.controller.spoil = (text) => (text.startsWith('$1=') ? undefined : text);
    expect(await failureOf(other.clock, other.positioner.identify())).toMatchObject({
      code: 'POSITIONER_BAD_ANSWER',
      facts: { missing: '$1' },
    });
  });

  it("goes no faster than the controller's own rate, and plans its time by it", async () => {
    const { clock, positioner } = makeRig({ settings: { 110: '300.000' } });
    await clock.run(positioner.identify().then(() => positioner.home()));
    const before = clock.monotonicMs();
    await clock.run(positioner.moveTo({ azimuth: 20 }));
    // 300 units a minute are 5°/s.
    expect(clock.monotonicMs() - before).toBeGreaterThan(4_000);
  });

  it.each(['Run', 'Jog', 'Hold:0', 'Door:1', 'Home', 'Tool'])(
    'refuses a machine in %s',
    async (startState) => {
      const { clock, controller, positioner } = makeRig({ startState });
      const code = await codeOf(clock, positioner.identify());
      expect(code).toBe(startState === 'Home' ? 'POSITIONER_NOT_ANSWERING' : 'POSITIONER_BUSY_AT_CONNECT');
      expect(controller.urgent.every(({ byte }) => byte === 0x3f)).toBe(true);
    },
  );

  it('does not take Idle for rest while the position changes', async () => {
    const { clock, controller, positioner } = makeRig();
    controller.spoil = (text) => text.replace('<Run', '<Idle');
    const connecting = codeOf(clock, positioner.identify());
    clock.at(clock.monotonicMs() + 1_000, () => controller.sendAsStranger('G1 X100 F600'));
    expect(await connecting).toBe('POSITIONER_BUSY_AT_CONNECT');
  });

  it('wakes a controller that sleeps', async () => {
    const { clock, controller, positioner } = makeRig({ startState: 'Sleep' });
    await clock.run(positioner.identify());
    expect(controller.state).toBe('Idle');
  });

  it('connects to a locked controller and leaves it locked until it is homed', async () => {
    const { clock, controller, positioner } = makeRig({ startState: 'Alarm' });
    await clock.run(positioner.identify());
    expect(controller.lines).not.toContain('$X');
    expect(controller.state).toBe('Alarm');
    await clock.run(positioner.home());
    expect(positioner.referenceValid).toBe(true);
    expect(controller.state).toBe('Idle');
  });

  it('refuses a controller without the axis', async () => {
    const { clock, positioner } = makeRig({ axisCount: 3 }, { axes: [elevation, { ...azimuth, word: 'A' }] });
    expect(await failureOf(clock, positioner.identify())).toMatchObject({
      code: 'POSITIONER_UNEXPECTED_CONTROLLER',
      facts: { axes: 'XYZ', wanted: 'YA' },
    });
  });

  it('knows the other family by its words', async () => {
    const { clock, controller, positioner } = makeRig();
    controller.spoil = (text) => (text.startsWith('<') || text === 'ok' ? undefined : text);
    controller.answerInstead = (line) =>
      line === 'M115' ? ['FIRMWARE_NAME:Other 2.0 PROTOCOL_VERSION:1.0', 'Cap:EMERGENCY_PARSER:1', 'ok'] : [];
    expect(await codeOf(clock, positioner.identify())).toBe('POSITIONER_UNEXPECTED_CONTROLLER');
  });

  it('gives up on silence in good time', async () => {
    const { clock, controller, positioner } = makeRig();
    controller.mute = true;
    expect(await codeOf(clock, positioner.identify())).toBe('POSITIONER_NOT_ANSWERING');
    expect(clock.monotonicMs()).toBeLessThan(15_000);
  });
});
