// Speed profiles against the textbook: t = d/v + v/a for a move that reaches its speed, 2·√(d/a) for one
// that does not, v²/2a to stop.
import * as fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { lengthOf, phasesOf, ramp } from '../../../../mocks/positioner/speed-profile.ts';

const totalSeconds = (phases: ReturnType<typeof phasesOf>): number =>
  phases.reduce((sum, phase) => sum + phase.seconds, 0);
const totalLength = (phases: ReturnType<typeof phasesOf>): number =>
  phases.reduce((sum, phase) => sum + lengthOf(phase), 0);

describe('phasesOf', () => {
  it('takes d/v + v/a when the cruise speed is reached', () => {
    // 90° at 30°/s and 360°/s²: 3 s + 1/12 s.
    expect(totalSeconds(phasesOf(90, 0, 30, 0, 360))).toBeCloseTo(3 + 30 / 360, 12);
  });

  it('takes 2·√(d/a) when the move is too short', () => {
    // 1° at 360°/s² peaks at √360 ≈ 18.97°/s.
    const phases = phasesOf(1, 0, 30, 0, 360);
    expect(totalSeconds(phases)).toBeCloseTo(2 * Math.sqrt(1 / 360), 12);
    expect(phases[0]!.speed + phases[0]!.acceleration * phases[0]!.seconds).toBeCloseTo(Math.sqrt(360), 9);
  });

  it('slows down first when it enters faster than the cruise speed', () => {
    // 20 → 10 at 100 takes 0.1 s and 1.5 units; 10 → 0 takes 0.1 s and 0.5; the rest of 10 at 10/s is 0.8 s.
    const phases = phasesOf(10, 20, 10, 0, 100);
    expect(totalSeconds(phases)).toBeCloseTo(1.0, 12);
  });

  it('covers its length, never exceeds the cruise speed and joins without a jump', () => {
    const positive = fc.double({ min: 0.01, max: 1000, noNaN: true });
    fc.assert(
      fc.property(positive, positive, positive, (length, cruise, acceleration) => {
        const phases = phasesOf(length, 0, cruise, 0, acceleration);
        expect(totalLength(phases) / length).toBeCloseTo(1, 9);
        let speed = 0;
        for (const phase of phases) {
          expect(Math.abs(phase.speed - speed)).toBeLessThan(1e-9 * cruise + 1e-9);
          speed = phase.speed + phase.acceleration * phase.seconds;
          expect(speed).toBeLessThanOrEqual(cruise * (1 + 1e-9));
        }
        expect(Math.abs(speed)).toBeLessThan(1e-6 * cruise);
      }),
    );
  });
});

describe('ramp', () => {
  it('needs v²/2a to stop', () => {
    expect(lengthOf(ramp(30, 0, 360))).toBeCloseTo((30 * 30) / (2 * 360), 12);
  });
});
