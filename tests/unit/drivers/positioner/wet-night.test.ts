// Everything that goes wrong on a wire or at the machine, at random moments and in any mix: an arrival that is
// claimed is true, whatever fails is typed, a stop that is confirmed has stopped, no motion leads outside travel.
import fc from 'fast-check';
import { expect, it } from 'vitest';
import {
  azimuth,
  failureOf,
  makeReadyRig,
  motionTargets,
  type Rig,
} from '../../../support/positioner-rig.ts';

const faults = {
  none: () => {},
  'loses an ok': ({ controller }: Rig) => spoilOnce(controller, (text) => text === 'ok', undefined),
  'damages an ok': ({ controller }: Rig) => spoilOnce(controller, (text) => text === 'ok', '\u00ffk'),
  'loses a report': ({ controller }: Rig) => spoilOnce(controller, isReport, undefined),
  'damages a report': ({ controller }: Rig) => spoilOnce(controller, isReport, '<Idle|MPos:7.\u00ff'),
  'shows a false zero once': ({ controller }: Rig) =>
    spoilOnce(controller, isReport, '<Idle|MPos:0.000,0.000,0.000>'),
  'shows a false Idle once': ({ controller }: Rig) =>
    spoilOnce(controller, isReport, (text) => text.replace('<Run', '<Idle')),
  noise: ({ controller }: Rig) => controller.sayRaw([0x0a, 0xff, 0x6f, 0x00, 0x3c, 0x0a]),
  'a second ok': ({ controller }: Rig) => controller.say('ok'),
  restart: ({ controller }: Rig) => controller.powerCycle(30),
  'restart, banner lost': ({ controller }: Rig) => controller.powerCycle(30, '', false),
  'slow restart': ({ controller }: Rig) => controller.powerCycle(1_600),
  'limit switch': ({ controller }: Rig) => controller.alarm(1, true),
  hold: ({ controller }: Rig) => controller.press('!'),
  'hold and release': ({ controller, clock }: Rig) => {
    controller.press('!');
    clock.at(clock.monotonicMs() + 1_500, () => controller.press('~'));
  },
  stall: ({ controller }: Rig) => controller.moving && controller.stallMotor(),
  'link drops': ({ controller }: Rig) => void controller.hangUp(),
  stop: ({ positioner }: Rig) => void positioner.stop().catch(() => {}),
} as const;

const isReport = (text: string): boolean => text.startsWith('<');

function spoilOnce(
  controller: Rig['controller'],
  isIt: (text: string) => boolean,
  becomes: string | undefined | ((text: string) => string),
): void {
  controller.spoil = (text) => {
    if (!isIt(text)) return text;
    controller.spoil = (same) => same;
    return typeof becomes === 'function' ? becomes(text) : becomes;
  };
}

const step = fc.record({
  targetDeg: fc.integer({ min: -180, max: 180 }),
  fault: fc.constantFrom(...(Object.keys(faults) as (keyof typeof faults)[])),
  afterMs: fc.integer({ min: 0, max: 6_000 }),
  throughApproach: fc.boolean(),
});

it('claims no arrival that is none', async () => {
  await fc.assert(
    fc.asyncProperty(fc.array(step, { minLength: 1, maxLength: 6 }), async (steps) => {
      const rig = await makeReadyRig({}, { axes: [azimuth] });
      const { clock, controller, positioner } = rig;
      for (const { targetDeg, fault, afterMs, throughApproach } of steps) {
        clock.at(clock.monotonicMs() + afterMs, () => faults[fault](rig));
        const moving = positioner.moveTo({ azimuth: targetDeg }, { throughApproach }).then((arrival) => {
          expect(arrival.position['azimuth']).toBeCloseTo(targetDeg, 2);
          expect(controller.moving).toBe(false);
          expect(controller.shaft[0]).toBeCloseTo(targetDeg, 2);
        });
        if (!(await failureOf(clock, moving))) continue;
        const unconfirmed = await failureOf(clock, positioner.stop());
        if (!unconfirmed) expect(controller.moving).toBe(false);
        // The known gap: a reset of our own wipes the proof of a restart that went unseen just before it.
        if (!positioner.referenceValid || controller.restartedUnseen) break;
      }
      for (const { X } of motionTargets(controller.lines)) expect(Math.abs(X ?? 0)).toBeLessThanOrEqual(190);
    }),
    { numRuns: 300 },
  );
});
