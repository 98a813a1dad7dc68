import { describe, expect, it } from 'vitest';
import { measureScene } from '../../../../mocks/analyzer/measure-scene.ts';
import { Scene } from '../../../../mocks/scene/scene.ts';
import { bench, type Visitor } from './visitor.ts';

async function data(visitor: Visitor): Promise<number[]> {
  return (await visitor.ask('CALC:DATA? SDATA')).split(',').map(Number);
}

describe('the instrument on the simulated range', () => {
  it('measures a turning antenna point by point, each at its own moment', async () => {
    const scene = new Scene({ noise: { snrDb: Infinity, reflectionSnrDb: Infinity } });
    const poseAt = (ms: number) => ({ azimuthDeg: 0.01 * ms, elevationDeg: 0, rollDeg: 0 });
    const { visitor, clock } = await bench({ measure: measureScene(scene, poseAt) });
    await visitor.ask('INIT:CONT OFF;:FREQ:STAR 850e6;STOP 880e6;:SWE:POIN 31;:BAND 100');
    await visitor.ask('CALC:PAR:DEF S21');
    const startMs = clock.monotonicMs();
    await visitor.ask('INIT;*OPC?', 1000);
    const values = await data(visitor);
    for (const i of [0, 15, 30]) {
      // 10.02 ms a point (1/100 Hz + 20 µs), measured in its middle.
      const ms = startMs + (i + 0.5) * 10.02;
      const { re, im } = scene.s('S21', 850e6 + i * 1e6, ms, poseAt(ms));
      expect(values[2 * i]).toBeCloseTo(re, 10);
      expect(values[2 * i + 1]).toBeCloseTo(im, 10);
    }
  });

  it('halves the noise power at half the IF bandwidth, and reads noise over noise with the output off', async () => {
    const scene = new Scene({ noise: { snrDb: 30 } });
    const still = { azimuthDeg: 0, elevationDeg: 0, rollDeg: 0 };
    const { visitor } = await bench({ measure: measureScene(scene, () => still) });
    await visitor.ask('INIT:CONT OFF;:FREQ:STAR 868e6;STOP 868e6;:SWE:POIN 20001;:CALC:PAR:DEF S21');
    const { re, im } = scene.s('S21', 868e6, 0, still);
    const noisePower = async (bandwidthHz: number): Promise<number> => {
      await visitor.ask(`BAND ${bandwidthHz};:INIT;*OPC?`, 60_000);
      const values = await data(visitor);
      return values.reduce((sum, v, i) => sum + (v - (i % 2 === 0 ? re : im)) ** 2, 0) / 20_001;
    };
    const ratio = (await noisePower(1000)) / (await noisePower(2000));
    // Each variance of 20 001 readings is good to 0.7 %: five errors of the ratio are 5 %.
    expect(Math.abs(ratio - 0.5)).toBeLessThan(0.025);
    await visitor.ask('OUTP OFF;:INIT;*OPC?', 60_000);
    const silence = await data(visitor);
    const beyond = silence
      .filter((_, i) => i % 2 === 0)
      .filter((v, i) => Math.hypot(v, silence[2 * i + 1]!) > 1);
    // Half of all ratios of two equal noises are above 1; five errors of 20 001 tosses are 1.8 %.
    expect(Math.abs(beyond.length / 20_001 - 0.5)).toBeLessThan(0.018);
  });
});
