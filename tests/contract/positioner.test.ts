// What Positioner promises, kept by the real drivers against the simulated controllers on every wire: a claimed
// arrival is true where the shaft stands, gear play and all; a stop stops; whatever strikes ends in a typed
// error or in recovery, and the cable is never wound beyond its range.
import { afterEach, describe, expect, it } from 'vitest';
import type { RangeAxis } from '../../daemon/files/range-file.ts';
import { expandPlan } from '../../daemon/plan/expand.ts';
import { DriverError } from '../../drivers/errors.ts';
import type { AxisSetup, Position, Positioner, PositionReport } from '../../drivers/positioner/positioner.ts';
import { faults } from '../../mocks/faults/fault-table.ts';
import type { ControllerOptions } from '../../mocks/positioner/controller.ts';
import {
  type Family,
  families,
  positionerOn,
  type ReachableBench,
  type Wire,
  wires,
} from '../support/bench-wires.ts';

/** The stage of the bench: 30°/s, 360°/s², 80 steps per degree. */
const rateDegPerS = 30;
const accelerationDegPerS2 = 360;
const halfStepDeg = 0.5 / 80;
const playDeg = 0.8;

const azimuth: RangeAxis = {
  name: 'azimuth',
  word: 'X',
  unitsPerDegree: 1,
  travelMinDeg: -190,
  travelMaxDeg: 190,
  rateDegPerS,
  accelerationDegPerS2,
  approachFrom: 'below',
  approachDeg: 2,
  settleMs: 0,
  toleranceDeg: 0.05,
  homing: 'none',
  sense: 1,
  boresightDeg: 0,
};
const elevation: RangeAxis = {
  ...azimuth,
  name: 'elevation',
  word: 'Y',
  travelMinDeg: -20,
  travelMaxDeg: 90,
  approachFrom: 'above',
};

const withPlay: ControllerOptions = { mechanics: { X: { playUnits: playDeg }, Y: { playUnits: playDeg } } };

/**
 * Home switches at the upper ends. A homed counter is 0 where the switch closes, so that the coordinates of
 * these axes are counted from there, downwards.
 */
const switchDeg = 200;
const switched: ControllerOptions = {
  settings: { 22: 1, 27: 1, 130: 400, 131: 400 },
  mechanics: { X: { playUnits: playDeg, switchUnits: switchDeg }, Y: { switchUnits: switchDeg } },
};
const homed = (axis: AxisSetup): AxisSetup => ({
  ...axis,
  homing: 'switch',
  travelMinDeg: -390,
  travelMaxDeg: -2,
});

/** A wire, and the family that the controller at its end belongs to. */
type Way = Wire & { family: Family };
const ways: readonly Way[] = families.flatMap((family) => wires.map((wire) => ({ ...wire, family })));

interface Rig {
  at: ReachableBench;
  positioner: Positioner;
  /** Where the shafts truly stand, in the axes' own coordinates. */
  shaftDeg: () => number[];
}

const open: ReachableBench[] = [];
const devices: Positioner[] = [];

afterEach(async () => {
  for (const at of open) await at.run(Promise.all(devices.splice(0).map((device) => device.close())));
  for (const at of open.splice(0)) await at.close();
});

async function rigOn(
  wire: Way,
  controller: ControllerOptions,
  axes: readonly AxisSetup[],
  options: { seed?: number; acceleration?: number } = {},
): Promise<Rig> {
  const at = await wire.reach(
    { positioner: { ...controller, family: wire.family }, scene: { seed: options.seed ?? 1 } },
    options.acceleration,
  );
  open.push(at);
  const positioner = positionerOn(at, axes, wire.family);
  devices.push(positioner);
  const zeroDeg = axes[0]?.homing === 'switch' ? switchDeg : 0;
  return {
    at,
    positioner,
    shaftDeg: () => at.bench.controller.shaftAt(at.nowMs()).map((unitsDeg) => unitsDeg - zeroDeg),
  };
}

async function readyOn(...args: Parameters<typeof rigOn>): Promise<Rig> {
  const rig = await rigOn(...args);
  await rig.at.run(rig.positioner.identify());
  await rig.at.run(rig.positioner.home());
  return rig;
}

/** The error of an operation that must fail; its promise may be looked at later. */
function failing(at: ReachableBench, work: Promise<unknown>): Promise<DriverError> {
  const caught = work.then(
    () => new Error('it did not fail'),
    (error: unknown) => error,
  );
  return at.run(caught).then((outcome) => {
    if (outcome instanceof DriverError) return outcome;
    throw outcome;
  });
}

/** Slow enough on sockets to be met in mid-move, whatever else this machine has to do. */
const unhurried = { acceleration: 10 };

/** Starts a move and waits until the shaft has truly turned a part of the way. */
async function inMidMove({ at, positioner, shaftDeg }: Rig, target: Position): Promise<Promise<unknown>[]> {
  const startDeg = shaftDeg()[0]!;
  const work = positioner.moveTo(target);
  // Its failure is looked at later; until then it must not count as unhandled.
  work.catch(() => {});
  for (let waited = 0; Math.abs(shaftDeg()[0]! - startDeg) < 20 && waited < 600_000; waited += 20) {
    await at.pass(20);
  }
  // In an array: a promise that is returned would be awaited.
  return [work];
}

function travelTo({ at, positioner }: Rig, target: Position, throughApproach = false): Promise<unknown> {
  return at.run(positioner.moveTo(target, { throughApproach }));
}

async function expectRest({ at }: Rig): Promise<void> {
  const before = at.bench.controller.shaftAt(at.nowMs());
  await at.pass(500);
  expect(at.bench.controller.shaftAt(at.nowMs())).toEqual(before);
}

describe.each(ways)('a positioner, $family, over $name', (wire) => {
  /** A stop in motion ends with a ramp: nothing is lost by it. The other family stops dead. */
  const stopsGently = wire.family === 'realtime-status';

  it('says which controller it is, and where it stands', async () => {
    const { at, positioner } = await readyOn(wire, withPlay, [azimuth, elevation]);
    expect(await at.run(positioner.identify())).toMatchObject({
      family: wire.family,
      firmware: expect.stringContaining(stopsGently ? '1.1h' : '2.0.x'),
    });
    expect(await at.run(positioner.readPosition())).toEqual({ azimuth: 0, elevation: 0 });
  });

  it('arrives where the shaft truly stands, from either side, gear play and all', async () => {
    const rig = await readyOn(wire, withPlay, [azimuth, elevation]);
    const { positioner, shaftDeg } = rig;
    const targets = [40, 40.5, 10, -77.3, -77.31, 188, -188, -186, 0, 1, -1];
    for (const azimuthDeg of targets) {
      await travelTo(rig, { azimuth: azimuthDeg });
      expect(Math.abs(shaftDeg()[0]! - azimuthDeg), `azimuth ${azimuthDeg}`).toBeLessThanOrEqual(
        halfStepDeg + 1e-9,
      );
      await expectRest(rig);
    }
    // From above the motor is ahead of the shaft by the play: always by all of it, whatever came before.
    for (const elevationDeg of [30, 80, 5, 5.1, 60]) {
      await travelTo(rig, { elevation: elevationDeg, azimuth: elevationDeg });
      expect(Math.abs(shaftDeg()[1]! - elevationDeg - playDeg)).toBeLessThanOrEqual(halfStepDeg + 1e-9);
      expect(Math.abs(shaftDeg()[0]! - elevationDeg)).toBeLessThanOrEqual(halfStepDeg + 1e-9);
    }
    expect(positioner.referenceValid).toBe(true);
  });

  it('would be off by the play without its approach: the check above can fail', async () => {
    const rig = await readyOn(wire, withPlay, [{ ...azimuth, approachDeg: 0 }]);
    await travelTo(rig, { azimuth: 40 });
    await travelTo(rig, { azimuth: 10 });
    expect(rig.shaftDeg()[0]! - 10).toBeCloseTo(playDeg, 2);
  });

  it('leaves and comes back when asked to pass through its approach', async () => {
    const rig = await readyOn(wire, withPlay, [azimuth]);
    await travelTo(rig, { azimuth: 25 });
    let leastDeg = 25;
    const end = rig.at.every(5, () => {
      leastDeg = Math.min(leastDeg, rig.shaftDeg()[0]!);
    });
    await travelTo(rig, { azimuth: 25 });
    expect(leastDeg).toBeCloseTo(25, 2);
    await travelTo(rig, { azimuth: 25 }, true);
    end();
    expect(leastDeg).toBeLessThan(24);
    expect(Math.abs(rig.shaftDeg()[0]! - 25)).toBeLessThanOrEqual(halfStepDeg + 1e-9);
  });

  it('publishes positions while it moves', async () => {
    const rig = await readyOn(wire, withPlay, [azimuth]);
    const reports: PositionReport[] = [];
    rig.positioner.position$.subscribe((report) => reports.push(report));
    await travelTo(rig, { azimuth: 180 });
    const moving = reports.filter((report) => report.moving);
    // The bench on sockets runs ahead of the driver's polling.
    if (wire.kind === 'memory') expect(moving.length).toBeGreaterThan(10);
    for (const { position } of moving) {
      expect(position['azimuth']).toBeGreaterThanOrEqual(0);
      expect(position['azimuth']).toBeLessThanOrEqual(180);
    }
    expect(reports.at(-1)).toMatchObject({ moving: false, position: { azimuth: 180 } });
  });

  it('stops in mid-move, says where, and knows what that costs', async () => {
    const rig = await readyOn(wire, withPlay, [azimuth], unhurried);
    const { at, positioner, shaftDeg } = rig;
    for (const [stops, targetDeg] of [150, -150].entries()) {
      const [moving] = await inMidMove(rig, { azimuth: targetDeg });
      const stopDeg = shaftDeg()[0]!;
      const stopped = positioner.stop();
      const refused = await failing(at, moving!);
      const report = await at.run(stopped);
      expect(refused.code).toBe('POSITIONER_STOPPED');
      // The shaft lags by the play when it comes from above.
      const lagDeg = targetDeg > 0 ? 0 : playDeg;
      if (!stopsGently) {
        // The motor runs on after its last pulse, by what the counter does not know: never believed again.
        const ranOnDeg = (rateDegPerS * 0.02) / 2;
        expect(Math.abs(shaftDeg()[0]! - report.position['azimuth']!)).toBeLessThanOrEqual(
          ranOnDeg + halfStepDeg,
        );
        if (wire.kind === 'memory') {
          expect(Math.abs(shaftDeg()[0]! - stopDeg)).toBeLessThan(0.1 * rateDegPerS);
          expect(report.haltMs).toBeLessThan(2000);
        }
        await expectRest(rig);
        expect(positioner.referenceValid).toBe(false);
        for (const again of [positioner.moveTo({ azimuth: 12 }), positioner.home()])
          expect((await failing(at, again)).code).toBe('POSITIONER_REFERENCE_LOST');
        return;
      }
      expect(Math.abs(shaftDeg()[0]! - lagDeg - report.position['azimuth']!)).toBeLessThanOrEqual(
        2 * halfStepDeg,
      );
      if (wire.kind === 'memory') {
        // Braking from full rate takes v²/2a; a byte's way and the controller's answer come on top.
        const brakingDeg = rateDegPerS ** 2 / (2 * accelerationDegPerS2);
        expect(Math.abs(shaftDeg()[0]! - stopDeg)).toBeLessThan(brakingDeg + 0.1 * rateDegPerS);
        expect(Math.abs(shaftDeg()[0]! - stopDeg)).toBeGreaterThan(0.5);
        expect(report.haltMs).toBeLessThan(1000);
      }
      await expectRest(rig);
      expect(positioner.referenceValid).toBe(true);
      await travelTo(rig, { azimuth: 12 });
      // A counter stops on a whole step, the simulated shaft within half of one: more is not lost by a stop.
      expect(Math.abs(shaftDeg()[0]! - 12)).toBeLessThanOrEqual((2 + stops) * halfStepDeg + 1e-9);
    }
  });

  it('brings a move to rest when its caller gives it up', async () => {
    const rig = await readyOn(wire, withPlay, [azimuth], unhurried);
    const { at, positioner } = rig;
    const patience = new AbortController();
    const given = positioner
      .moveTo({ azimuth: 180 }, { signal: patience.signal })
      .catch((error: unknown) => error);
    while (rig.shaftDeg()[0]! < 20) await at.pass(20);
    const reason = new Error('the caller has had enough');
    patience.abort(reason);
    expect(await at.run(given)).toBe(reason);
    expect(rig.shaftDeg()[0]).toBeLessThan(179);
    await expectRest(rig);
    expect(positioner.referenceValid).toBe(stopsGently);
    if (!stopsGently) return;
    await travelTo(rig, { azimuth: 12 });
    expect(Math.abs(rig.shaftDeg()[0]! - 12)).toBeLessThanOrEqual(2 * halfStepDeg + 1e-9);
  });

  it('is none the worse for a stop at rest', async () => {
    const rig = await readyOn(wire, withPlay, [azimuth]);
    const { at, positioner } = rig;
    await travelTo(rig, { azimuth: 30 });
    expect((await at.run(positioner.stop())).position['azimuth']).toBeCloseTo(30, 2);
    expect(at.bench.controller.state).toBe('Idle');
    await travelTo(rig, { azimuth: 31 });
    expect(Math.abs(rig.shaftDeg()[0]! - 31)).toBeLessThanOrEqual(halfStepDeg + 1e-9);
  });

  it('refuses a place outside travel before a byte is sent', async () => {
    const rig = await readyOn(wire, withPlay, [azimuth, elevation]);
    const { at, positioner } = rig;
    await travelTo(rig, { azimuth: -150, elevation: 40 });
    let turnedDeg = 0;
    const before = rig.shaftDeg();
    const end = at.every(5, () => {
      turnedDeg = Math.max(turnedDeg, ...rig.shaftDeg().map((deg, axis) => Math.abs(deg - before[axis]!)));
    });
    let answered = 0;
    at.bench.controller.answered$.subscribe(() => {
      answered += 1;
    });
    const targets: Position[] = [
      { azimuth: 190.01 },
      // Reachable only without the approach from below.
      { azimuth: -188.5 },
      { azimuth: Number.NaN },
      { azimuth: Number.POSITIVE_INFINITY },
      { azimuth: 0, elevation: 88.5 },
      { azimuth: 0, roll: 0 },
      // The same direction as −160°, a turn away.
      { azimuth: 200 },
    ];
    for (const target of targets) {
      expect((await failing(at, positioner.moveTo(target))).code).toBe('POSITIONER_OUTSIDE_TRAVEL');
    }
    await at.pass(1000);
    end();
    expect(turnedDeg).toBe(0);
    expect(answered).toBe(0);
  });

  it('ends in alarm when a limit trips, and moves again only when homed', async () => {
    const rig = await readyOn(wire, switched, [homed(azimuth)], unhurried);
    const { at, positioner } = rig;
    const [moving] = await inMidMove(rig, { azimuth: -350 });
    at.bench.faults.inject('alarm');
    expect((await failing(at, moving!)).code).toBe('POSITIONER_ALARM');
    expect(positioner.referenceValid).toBe(false);
    expect((await failing(at, positioner.moveTo({ azimuth: -100 }))).code).toBe('POSITIONER_REFERENCE_LOST');
    await expectRest(rig);
    if (wire.family === 'position-report') {
      // Halted: nothing helps but its reset button.
      expect((await failing(at, positioner.home())).code).toBe('POSITIONER_ALARM');
      at.bench.controller.restart();
      await at.pass(wire.kind === 'memory' ? 500 : 6000);
    }
    await at.run(positioner.home());
    await travelTo(rig, { azimuth: -100 });
    expect(Math.abs(rig.shaftDeg()[0]! + 100)).toBeLessThanOrEqual(0.05);
  });

  for (const when of ['at rest', 'in mid-move'] as const) {
    it(`knows that a restart ${when} has cost it its position`, async () => {
      const rig = await readyOn(wire, switched, [homed(azimuth)], unhurried);
      const { at, positioner } = rig;
      await travelTo(rig, { azimuth: -200 });
      let refused: Promise<DriverError>;
      if (when === 'at rest') {
        at.bench.faults.inject('restart');
        await at.pass(wire.kind === 'memory' ? 500 : 6000);
        refused = failing(at, positioner.moveTo({ azimuth: -100 }));
      } else {
        const [moving] = await inMidMove(rig, { azimuth: -100 });
        at.bench.faults.inject('restart');
        refused = failing(at, moving!);
      }
      expect((await refused).code).toBe('POSITIONER_RESTARTED');
      expect(positioner.referenceValid).toBe(false);
      expect((await failing(at, positioner.moveTo({ azimuth: -100 }))).code).toBe('POSITIONER_RESTARTED');
      await at.run(positioner.home());
      await travelTo(rig, { azimuth: -100 });
      expect(Math.abs(rig.shaftDeg()[0]! + 100)).toBeLessThanOrEqual(0.05);
    });
  }

  it('believes no zero that a restart has moved where there is no home switch', async () => {
    const rig = await readyOn(wire, withPlay, [azimuth]);
    const { at, positioner } = rig;
    await travelTo(rig, { azimuth: 90 });
    at.bench.faults.inject('restart');
    await at.pass(wire.kind === 'memory' ? 500 : 6000);
    expect((await failing(at, positioner.home())).code).toBe('POSITIONER_REFERENCE_LOST');
    await failing(at, positioner.moveTo({ azimuth: 0 }));
    expect(rig.shaftDeg()[0]).toBeCloseTo(90, 2);
  });

  // The other family has no hold: there is nothing to test, and so nothing to skip.
  if (wire.family === 'realtime-status')
    it('leaves a hold to whoever pressed it, and goes on after a stop', async () => {
      const rig = await readyOn(wire, withPlay, [azimuth], unhurried);
      const { at, positioner } = rig;
      const [moving] = await inMidMove(rig, { azimuth: 180 });
      at.bench.faults.inject('hold-pressed');
      expect((await failing(at, moving!)).code).toBe('POSITIONER_HELD');
      expect(at.bench.controller.state).toBe('Hold');
      await expectRest(rig);
      expect((await failing(at, positioner.moveTo({ azimuth: 0 }))).code).toBe('POSITIONER_HELD');
      expect(at.bench.controller.state).toBe('Hold');
      await at.run(positioner.stop());
      await travelTo(rig, { azimuth: -20 });
      expect(Math.abs(rig.shaftDeg()[0]! + 20)).toBeLessThanOrEqual(2 * halfStepDeg + 1e-9);
    });

  it('moves nothing and is refused when somebody else moves the controller', async () => {
    const rig = await rigOn(wire, withPlay, [azimuth]);
    const stranger = rig.at.link('positioner');
    await rig.at.run(stranger.open());
    await rig.at.pass(100);
    await stranger.write(Buffer.from('G21\nG90\nG1 X170 F20\n'));
    await rig.at.pass(wire.kind === 'memory' ? 500 : 6000);
    expect((await failing(rig.at, rig.positioner.identify())).code).toBe('POSITIONER_BUSY_AT_CONNECT');
    expect(rig.at.bench.controller.state).toBe('Run');
  });

  it('a full turn stays within the cable-wrap range', async () => {
    // The cable allows little more than a turn, and boresight is not in its middle: the cut has to begin
    // elsewhere than its angles say.
    const narrow: RangeAxis = { ...azimuth, travelMinDeg: -170, travelMaxDeg: 200, boresightDeg: 35 };
    const rig = await readyOn(wire, withPlay, [narrow]);
    const { steps } = expandPlan(
      {
        path: 'turn.plan.yaml',
        text: '',
        kind: 'pattern',
        antenna: { name: 'yagi', revision: 'A' },
        band: { startHz: 820e6, stopHz: 920e6, points: 11 },
        markersHz: [],
        analyzer: { ifBandwidthHz: 1000, powerDbm: 0, averages: 1 },
        gainReference: 'none',
        cuts: [
          {
            name: 'azimuth',
            axis: 'azimuth',
            plane: 'H',
            fromDeg: -180,
            toDeg: 180,
            stepDeg: 10,
            at: {},
            autRollDeg: 0,
            component: 'co',
          },
        ],
        tieEverySamples: 12,
        checks: { closureDb: 0.2, driftDb: 0.5 },
      },
      { name: 'narrow', positioner: { axes: [narrow] } },
    );
    const truthDeg: number[] = [];
    const end = rig.at.every(10, () => {
      truthDeg.push(rig.shaftDeg()[0]!);
    });
    const measured = new Set<number>();
    for (const step of steps) {
      await travelTo(rig, step.target);
      expect(Math.abs(rig.shaftDeg()[0]! - step.target['azimuth']!)).toBeLessThanOrEqual(halfStepDeg + 1e-9);
      // Pattern angle = position − boresight, a turn being nothing.
      const offDeg = (rig.shaftDeg()[0]! - narrow.boresightDeg - step.angleDeg) / 360;
      expect(Math.abs(offDeg - Math.round(offDeg)) * 360).toBeLessThanOrEqual(halfStepDeg + 1e-6);
      if (step.purpose === 'cut') measured.add(step.angleDeg);
    }
    end();
    expect(measured.size).toBe(36);
    // A turn and its ties at up to 30°/s, looked at every 10 ms.
    expect(truthDeg.length).toBeGreaterThan(1500);
    expect(Math.max(...truthDeg)).toBeGreaterThan(170);
    expect(Math.max(...truthDeg)).toBeLessThanOrEqual(narrow.travelMaxDeg);
    expect(Math.min(...truthDeg)).toBeLessThan(-150);
    expect(Math.min(...truthDeg)).toBeGreaterThanOrEqual(narrow.travelMinDeg);
  });
});

const strikes = faults.filter((fault) => fault.target === 'positioner').map((fault) => fault.name);
/** There is no hold in the other family. */
const strikesOn = (family: Family): string[] =>
  strikes.filter((name) => family === 'realtime-status' || name !== 'hold-pressed');
/** Between motor and shaft there is nothing that could tell a controller without encoders. */
const unnoticed: Readonly<Record<string, number>> = { 'step-loss': 3, stall: 2 * rateDegPerS };

/** Brings the machine back as a run would: stopped, identified, homed; as often as it takes. */
async function bringBack({ at, positioner }: Rig, failed: string[]): Promise<void> {
  for (let tried = 0; ; tried += 1) {
    try {
      await at.run(positioner.stop());
      await at.run(positioner.identify());
      await at.run(positioner.home());
      return;
    } catch (error) {
      if (!(error instanceof DriverError) || tried === 10) throw error;
      failed.push(error.code);
      await at.pass(2000);
    }
  }
}

/** Two moves with a strike on the way; then everything must be well again. Returns the codes of what failed. */
async function movesStruck(rig: Rig, name: string, when: string, strike: () => void): Promise<string[]> {
  const { at, positioner, shaftDeg } = rig;
  const failed: string[] = [];
  await travelTo(rig, { azimuth: -200 });
  strike();
  for (const targetDeg of [-140, -170]) {
    try {
      await travelTo(rig, { azimuth: targetDeg });
      const offDeg = Math.abs(shaftDeg()[0]! - targetDeg);
      expect(offDeg, `${name} ${when}: off at ${targetDeg}°`).toBeLessThanOrEqual(
        (unnoticed[name] ?? 0) + 0.05,
      );
    } catch (error) {
      if (!(error instanceof DriverError)) throw error;
      failed.push(error.code);
      await bringBack(rig, failed);
    }
  }
  await at.pass(4000);
  await bringBack(rig, failed);
  await travelTo(rig, { azimuth: -160 });
  expect(Math.abs(shaftDeg()[0]! + 160), `${name} ${when}: homed anew`).toBeLessThanOrEqual(0.05);
  expect(positioner.referenceValid).toBe(true);
  return failed;
}

/**
 * What each fault may lead to; the first is sure to come. A late answer may be taken for that to the next line:
 * the read-back finds it out.
 */
const felt: Readonly<Record<string, readonly string[]>> = {
  'positioner-link-drop': ['LINK_CLOSED'],
  'late-ok': ['POSITIONER_WRONG_PLACE', 'POSITIONER_NOT_ANSWERING'],
  restart: ['POSITIONER_RESTARTED'],
  alarm: ['POSITIONER_ALARM'],
  'hold-pressed': ['POSITIONER_HELD'],
};

/** Homing with a stalled motor finds no switch: there the other family halts. */
function feltOn(family: Family, name: string): readonly string[] {
  return family === 'position-report' && name === 'stall' ? ['POSITIONER_ALARM'] : (felt[name] ?? []);
}

async function struckAt(wire: Way, name: string, momentsMs: readonly number[]): Promise<string[]> {
  const failed: string[] = [];
  for (const afterMs of momentsMs) {
    // Out of a halt only a reset leads: here opening the link is one, as on many boards.
    const isHalt = wire.family === 'position-report' && (name === 'alarm' || name === 'stall');
    const controller = isHalt ? { ...switched, onConnect: 'restarts' as const } : switched;
    const rig = await readyOn(wire, controller, [homed(azimuth)], { seed: afterMs });
    const strike = (): void => {
      rig.at.later(afterMs, () => void rig.at.bench.faults.inject(name));
    };
    failed.push(...(await movesStruck(rig, name, `after ${afterMs} ms`, strike)));
    expect(rig.at.bench.faults.journal).toHaveLength(1);
  }
  return failed;
}

describe.each(ways.filter((way) => way.kind === 'memory'))(
  'faults of the controller, $family, over $name',
  (wire) => {
    const strideMs = wire.name === 'memory' ? 130 : 900;
    const momentsMs = Array.from({ length: Math.floor(6000 / strideMs) }, (_, i) => 1 + i * strideMs);

    it.each(strikesOn(wire.family))(
      '%s: an error with a code or a true arrival, never a hang',
      async (name) => {
        const failed = await struckAt(wire, name, momentsMs);
        const expected = feltOn(wire.family, name);
        expect(expected).toEqual(expect.arrayContaining([...new Set(failed)]));
        const isSure =
          wire.name === 'memory' &&
          (wire.family === 'realtime-status' || !['late-ok', 'stall'].includes(name));
        if (isSure) expect(failed.slice(0, 1)).toEqual(expected.slice(0, 1));
      },
    );
  },
);

it.each(ways.filter((way) => way.kind === 'sockets'))(
  'faults of the controller, $family, over sockets: each on a bench of its own',
  async (wire) => {
    const names = strikesOn(wire.family);
    const failed = await Promise.all(names.map((name) => struckAt(wire, name, [1500, 4500])));
    for (const [index, name] of names.entries()) {
      // Of a bench that runs ahead an answer is never late, and a driver may close a link that is cut anyway.
      expect(feltOn(wire.family, name), name).toEqual(expect.arrayContaining(failed[index] ?? []));
    }
    expect(failed.flat().length).toBeGreaterThan(0);
  },
);
