import { describe, expect, it } from 'vitest';
import {
  densityDistanceM,
  eirpW,
  fccPublicWM2,
  icnirpPublicWM2,
} from '../../../../daemon/pattern/power-density.ts';

describe('power density', () => {
  it('is that of a sphere: 4π W leave 1 W/m² at 1 m, a quarter at 2 m', () => {
    expect(densityDistanceM(4 * Math.PI, 1)).toBeCloseTo(1, 12);
    expect(densityDistanceM(4 * Math.PI, 0.25)).toBeCloseTo(2, 12);
    expect(densityDistanceM(4 * Math.PI, 1, 4)).toBeCloseTo(2, 12);
  });

  it('counts from an isotropic antenna: 20 dBm and 10 dBi are 1 W', () => {
    expect(eirpW(20, 10)).toBeCloseTo(1, 12);
  });

  // Edges from the tables themselves: 47 CFR 1.1310 table 1 (B), ICNIRP 2020 table 5.
  it.each([
    [29e6, 'absent', 'absent'],
    [30e6, 'absent', 2],
    [300e6, 2, 2],
    [400e6, 2, 400 / 150],
    [2000e6, 10, 10],
    [2001e6, 10, 10],
    [100e9, 10, 10],
    [101e9, 10, 'absent'],
    [301e9, 'absent', 'absent'],
  ] as const)('has the public levels at %d Hz: ICNIRP %s, 47 CFR %s', (hz, icnirp, fcc) => {
    const shown = (figure: ReturnType<typeof fccPublicWM2>) =>
      figure.kind === 'value' ? figure.value : figure.kind;
    expect(shown(icnirpPublicWM2(hz))).toBe(icnirp);
    expect(shown(fccPublicWM2(hz))).toBe(fcc);
  });
});
