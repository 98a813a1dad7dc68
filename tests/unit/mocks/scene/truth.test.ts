import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { Scene } from '../../../../mocks/scene/scene.ts';
import type { AntennaDescription } from '../../../../mocks/scene/scene-description.ts';
import { matchTruth, realizedGainDbi, truthAt } from '../../../../mocks/scene/truth.ts';
import type { Lobe } from '../../../../mocks/scene/truth-cut.ts';

const lightspeed = 299_792_458;

function truthOf(aut: AntennaDescription, frequencyHz: number, fixed = {}) {
  return truthAt(new Scene({ antennas: { aut } }), frequencyHz, 'aut', fixed);
}

// The NEC-2 program's own figures at 868 MHz, read from 0.05° cuts by another reader (numpy, linear in dB):
// stated tolerances gain 0.02 dB, beamwidth 0.1°, front-to-back 0.1 dB, impedance 0.05 Ω. 868 MHz lies
// between two computed frequencies of the band, so this is also a test of the interpolation.
describe('the computed antennas at 868 MHz', () => {
  it('5-element Yagi', () => {
    const truth = truthOf({ kind: 'yagi5' }, 868e6);
    expect(Math.abs(truth.gainDbi - 11.1)).toBeLessThan(0.02);
    expect(Math.abs(Number(truth.azimuth.halfPowerBeamwidthDeg) - 61.29)).toBeLessThan(0.1);
    expect(Math.abs(Number(truth.elevation.halfPowerBeamwidthDeg) - 49.67)).toBeLessThan(0.1);
    expect(Math.abs(truth.azimuth.frontToBackDb - 17.66)).toBeLessThan(0.1);
    expect(Math.abs(truth.azimuth.frontToRearDb - 17.66)).toBeLessThan(0.1);
    expect(Math.abs(truth.elevation.frontToBackDb - 17.66)).toBeLessThan(0.1);
    // Lobes at 86° and 274° with −1.22 dBi, at 73° of elevation with −16.706 dBi: same tolerance as front-to-back.
    const right = truth.azimuth.firstSideLobeRight as Lobe;
    expect(Math.abs(right.levelDb - (-1.22 - 11.1))).toBeLessThan(0.1);
    expect(Math.abs(right.angleDeg - 86)).toBeLessThan(0.5);
    const up = truth.elevation.firstSideLobeRight as Lobe;
    expect(Math.abs(up.levelDb - (-16.706 - 11.1))).toBeLessThan(0.1);
    expect(Math.abs(up.angleDeg - 73)).toBeLessThan(0.5);
    // 41.009 + j1.931 Ω: |Γ| 0.10102, return loss 19.912 dB, VSWR 1.2247, mismatch loss 0.0445 dB. Between
    // knots 5 MHz apart the impedance may be some tenths of an ohm off: 0.001 of |Γ|.
    expect(Math.abs(Math.hypot(truth.reflection.re, truth.reflection.im) - 0.10102)).toBeLessThan(0.001);
    expect(Math.abs(truth.vswr - 1.2247)).toBeLessThan(0.003);
    expect(Math.abs(truth.gainDbi - truth.azimuth.realizedGainDbi - 0.0445)).toBeLessThan(0.001);
  });

  it('dipole', () => {
    const truth = truthOf({ kind: 'dipole' }, 868e6);
    expect(Math.abs(truth.gainDbi - 2.144)).toBeLessThan(0.02);
    expect(Math.abs(Number(truth.elevation.halfPowerBeamwidthDeg) - 78.26)).toBeLessThan(0.1);
    expect(truth.elevation.peakDeg).toBeCloseTo(0, 3);
    expect(truth.azimuth.halfPowerBeamwidthDeg).toMatchObject({ kind: 'absent' });
    expect(truth.azimuth.firstSideLobeLeft).toMatchObject({ kind: 'absent' });
    expect(truth.azimuth.rangeDb).toBeLessThan(0.01);
    expect(Math.abs(truth.returnLossDb - 13.405)).toBeLessThan(0.02);
    expect(Math.abs(truth.vswr - 1.5435)).toBeLessThan(0.003);
  });
});

interface StoredCut {
  gainDbi: number[];
  phaseDeg: number[];
}

function stored(name: string): { frequenciesHz: number[]; azimuth: StoredCut[]; elevation: StoredCut[] } {
  const path = new URL(`../../../../mocks/scene/data/${name}-band.json`, import.meta.url);
  return JSON.parse(readFileSync(path, 'utf8'));
}

// Gains are stored to 0.001 dB: half of that at full level is 2e-4 of the amplitude's peak (up to 3.7).
describe.each(['yagi5', 'dipole'] as const)('%s over the full turn at the computed frequencies', (kind) => {
  const data = stored(kind);
  const scene = new Scene({ antennas: { aut: { kind } } });
  const antenna = scene.antennas.aut.antenna;
  const amplitude = (dbi: number): number => (dbi <= -100 ? 0 : 10 ** (dbi / 20));

  it('an azimuth turn is the azimuth cut, phases included', () => {
    data.frequenciesHz.forEach((frequencyHz, k) => {
      const cut = data.azimuth[k]!;
      for (let a = 0; a < 360; a += 7) {
        const { co } = antenna.complexGain(frequencyHz, a, 0);
        const phase = (cut.phaseDeg[a]! * Math.PI) / 180;
        const expected = amplitude(cut.gainDbi[a]!);
        const miss = Math.hypot(co.re - expected * Math.cos(phase), co.im - expected * Math.sin(phase));
        expect(miss).toBeLessThan(1e-3);
      }
    });
  });

  it.each(['azimuth-over-elevation', 'elevation-over-azimuth'] as const)(
    'tilting the antenna is the elevation cut, over the top and back (%s)',
    (stacking) => {
      const tilted = new Scene({
        antennas: { aut: { kind }, range: { kind: 'isotropic' } },
        noise: { snrDb: Infinity },
        stacking,
      });
      data.frequenciesHz.forEach((frequencyHz, k) => {
        const cut = data.elevation[k]!;
        const s = (elevationDeg: number) =>
          tilted.s('S21', frequencyHz, 0, { azimuthDeg: 0, elevationDeg, rollDeg: 0 });
        const ahead = s(0);
        const scale = amplitude(cut.gainDbi[0]!) / (ahead.re ** 2 + ahead.im ** 2);
        for (let e = 0; e < 360; e += 7) {
          const z = s(e);
          // Ratio to boresight, so that path and match drop out: complex, hence phases too.
          const re = (z.re * ahead.re + z.im * ahead.im) * scale;
          const im = (z.im * ahead.re - z.re * ahead.im) * scale;
          const phase = ((cut.phaseDeg[e]! - cut.phaseDeg[0]!) * Math.PI) / 180;
          const expected = amplitude(cut.gainDbi[e]!);
          expect(Math.hypot(re - expected * Math.cos(phase), im - expected * Math.sin(phase))).toBeLessThan(
            2e-3,
          );
        }
      });
    },
  );
});

describe('over the band', () => {
  it('the Yagi falls apart above 900 MHz', () => {
    const scene = new Scene();
    const worst = (frequencyHz: number) => truthAt(scene, frequencyHz);
    // 900 MHz: 4.115 + j40.593 Ω; 910 MHz: front-to-back 4.95 dB from a peak at 57°, 920 MHz: it fires backwards.
    expect(worst(900e6).vswr).toBeGreaterThan(10);
    expect(Math.abs(worst(910e6).azimuth.peakDeg)).toBeCloseTo(57, 0);
    expect(Math.abs(worst(920e6).azimuth.peakDeg)).toBeCloseTo(180, 3);
    expect(worst(860e6).vswr).toBeLessThan(1.2);
  });

  it('half-power beamwidth and gain change smoothly between the computed frequencies', () => {
    const scene = new Scene();
    const at = (mhz: number) => truthAt(scene, mhz * 1e6).azimuth;
    // Values computed at 860 and 870 MHz: 63.43° and 60.73°, 10.931 and 11.135 dBi; in between they fall and rise.
    const steps = [860, 862, 864, 866, 868, 870].map(at);
    for (let i = 1; i < steps.length; i++) {
      expect(Number(steps[i]!.halfPowerBeamwidthDeg)).toBeLessThan(
        Number(steps[i - 1]!.halfPowerBeamwidthDeg),
      );
    }
    expect(Number(steps[0]!.halfPowerBeamwidthDeg)).toBeCloseTo(63.43, 1);
    expect(Number(steps[5]!.halfPowerBeamwidthDeg)).toBeCloseTo(60.73, 1);
  });

  // The NEC dipole: reactance −5.249 Ω at 850 and +2.782 Ω at 860 MHz, so resonance near 856.5 MHz; R is
  // 50 Ω-near only lower down, so |Γ| is least near 849.5 MHz (5 MHz sweep of the same program).
  it('best match and resonance are two frequencies', () => {
    const match = matchTruth(new Scene({ antennas: { aut: { kind: 'dipole' } } }), 820e6, 920e6);
    expect(Math.abs(match.bestMatchHz! - 849.5e6)).toBeLessThan(0.2e6);
    expect(Math.abs(match.resonanceHz! - 856.5e6)).toBeLessThan(0.2e6);
  });

  it('longer elements move everything down in frequency', () => {
    const longer = new Scene({ antennas: { aut: { kind: 'dipole', lengthScale: 1.01 } } });
    const match = matchTruth(longer, 820e6, 900e6);
    expect(Math.abs(match.resonanceHz! * 1.01 - 856.5e6)).toBeLessThan(0.2e6);
  });

  it('tells when there is no resonance in the band, and no best match', () => {
    for (const magnitude of [0, 0.3]) {
      const reflection = { magnitude, phaseDeg: 40 };
      const scene = new Scene({ antennas: { aut: { kind: 'isotropic', reflection } } });
      expect(matchTruth(scene, 820e6, 920e6)).toEqual({ bestMatchHz: undefined, resonanceHz: undefined });
    }
  });

  it('has its best match at an end of a band that lies beside the resonance', () => {
    const scene = new Scene({ antennas: { aut: { kind: 'dipole' } } });
    expect(matchTruth(scene, 870e6, 920e6).bestMatchHz).toBeCloseTo(870e6, -2);
  });
});

describe('antennas that are formulas', () => {
  // Uniform line source: beamwidth 0.885893 rad · λ/L exactly in sine space (Balanis, table 7.1; 50.76°·λ/L
  // for long lines); for 10 λ the exact figures are 5.07745° and a first side lobe at 8.2232°, −13.2615 dB.
  it('a line of 10 wavelengths, and beamwidth with frequency', () => {
    const lengthM = (10 * lightspeed) / 1e9;
    const { azimuth, elevation } = truthOf({ kind: 'line-source', lengthM }, 1e9);
    expect(Number(azimuth.halfPowerBeamwidthDeg)).toBeCloseTo(5.07745, 3);
    expect((azimuth.firstSideLobeRight as Lobe).angleDeg).toBeCloseTo(8.2232, 2);
    expect((azimuth.firstSideLobeRight as Lobe).levelDb).toBeCloseTo(-13.2615, 3);
    expect((azimuth.firstSideLobeLeft as Lobe).angleDeg).toBeCloseTo(-8.2232, 2);
    expect(azimuth.frontToBackDb).toBeCloseTo(0, 9);
    expect(elevation.halfPowerBeamwidthDeg).toMatchObject({ kind: 'absent' });
    for (const f of [0.8e9, 1.25e9]) {
      const beamwidth = Number(truthOf({ kind: 'line-source', lengthM }, f).azimuth.halfPowerBeamwidthDeg);
      const sine = (0.885893 / 2) * (lightspeed / f / lengthM);
      expect(beamwidth).toBeCloseTo((2 * Math.asin(sine) * 180) / Math.PI, 3);
      expect(Math.abs(beamwidth / ((50.7579 * lightspeed) / f / lengthM) - 1)).toBeLessThan(2e-3);
    }
  });

  // Directivity of a long uniform line of isotropic radiators is 2L/λ (closed form limit): 20 for 10 λ.
  it('a long line has its own directivity', () => {
    const lengthM = (10 * lightspeed) / 1e9;
    const gain = truthOf({ kind: 'line-source', lengthM }, 1e9).gainDbi;
    expect(Math.abs(gain - 10 * Math.log10(20))).toBeLessThan(0.05);
    expect(truthOf({ kind: 'line-source', lengthM, gainDbi: 9 }, 1e9).gainDbi).toBeCloseTo(9, 9);
  });

  // Cardioid: D 4.77121 dBi, beamwidth 131.06°, −6.0206 dB at ±90° (closed form).
  it('cardioid', () => {
    const scene = new Scene({ antennas: { aut: { kind: 'cardioid' } } });
    const { azimuth, elevation } = truthAt(scene, 868e6);
    for (const cut of [azimuth, elevation]) {
      expect(cut.realizedGainDbi).toBeCloseTo(4.77121, 4);
      expect(Number(cut.halfPowerBeamwidthDeg)).toBeCloseTo(131.06, 1);
    }
    const side = realizedGainDbi(scene, 'aut', 868e6)({ azimuthDeg: 90, elevationDeg: 0, rollDeg: 0 });
    expect(side - azimuth.realizedGainDbi).toBeCloseTo(-6.0206, 3);
    const raised = truthOf({ kind: 'cardioid', gainDbi: 7, frontToBackDb: 22 }, 868e6);
    expect(raised.azimuth.frontToBackDb).toBeCloseTo(22, 6);
    // Highest within 180° ± 60° is its edge: field b + (1 − b)(1 + cos 120°)/2.
    const b = 10 ** (-22 / 20);
    expect(raised.azimuth.frontToRearDb).toBeCloseTo(-20 * Math.log10(b + (1 - b) / 4), 6);
    expect(raised.gainDbi).toBeCloseTo(7, 9);
  });

  // Thin half-wave dipole: 2.15088 dBi, E-plane beamwidth 78.0777° (integration; root of the pattern).
  it('half-wave dipole', () => {
    const { elevation, azimuth } = truthOf({ kind: 'half-wave-dipole' }, 868e6);
    expect(elevation.realizedGainDbi).toBeCloseTo(2.15088, 4);
    expect(Number(elevation.halfPowerBeamwidthDeg)).toBeCloseTo(78.0777, 3);
    expect(azimuth.rangeDb).toBeLessThan(1e-9);
  });

  it('realized gain pays for the mismatch and for heat', () => {
    const reflection = { magnitude: 0.3, phaseDeg: 0 };
    const truth = truthOf({ kind: 'isotropic', gainDbi: 5, reflection, lossDb: 0.7 }, 868e6);
    // |Γ| 0.3: mismatch loss −10 log10(1 − 0.09) = 0.4096 dB (definition).
    expect(truth.azimuth.realizedGainDbi).toBeCloseTo(5 - 0.7 - 0.4096, 4);
    expect(truth.gainDbi).toBeCloseTo(4.3, 9);
    expect(truth.vswr).toBeCloseTo(1.3 / 0.7, 9);
  });
});

describe('a turned pattern', () => {
  it('peaks where it was turned to, in both cuts, with its beamwidth unchanged', () => {
    const straight = truthOf({ kind: 'yagi5' }, 868e6);
    const aside = truthOf({ kind: 'yagi5', rotateAzimuthDeg: 3.7 }, 868e6);
    expect(aside.azimuth.peakDeg).toBeCloseTo(3.7, 4);
    expect(aside.azimuth.halfPowerBeamwidthDeg).toBeCloseTo(
      Number(straight.azimuth.halfPowerBeamwidthDeg),
      6,
    );
    expect(aside.azimuth.realizedGainDbi).toBeCloseTo(straight.azimuth.realizedGainDbi, 9);
    const up = truthOf({ kind: 'yagi5', rotateElevationDeg: -2.4 }, 868e6);
    expect(up.elevation.peakDeg).toBeCloseTo(-2.4, 4);
    expect(up.elevation.halfPowerBeamwidthDeg).toBeCloseTo(
      Number(straight.elevation.halfPowerBeamwidthDeg),
      6,
    );
  });

  it('is found by an axis standing where the pattern was turned', () => {
    const aut = { kind: 'yagi5' as const, rotateAzimuthDeg: 5, rotateElevationDeg: 8 };
    const peak = truthOf(aut, 868e6, { elevationDeg: 8 }).azimuth;
    expect(peak.peakDeg).toBeCloseTo(5, 1);
    expect(peak.realizedGainDbi).toBeCloseTo(truthOf({ kind: 'yagi5' }, 868e6).azimuth.realizedGainDbi, 2);
  });
});

describe('directions off both cuts', () => {
  it('keep the mean gain over the sphere near 0 dBi, as a lossless antenna must', () => {
    for (const [kind, limitDb] of [
      ['dipole', 0.02],
      ['yagi5', 0.1],
    ] as const) {
      const antenna = new Scene({ antennas: { aut: { kind } } }).antennas.aut.antenna;
      let sum = 0;
      for (let e = -87.5; e < 90; e += 5) {
        for (let a = 0; a < 360; a += 5) {
          const { co } = antenna.complexGain(870e6, a, e);
          sum += (co.re ** 2 + co.im ** 2) * Math.cos((e * Math.PI) / 180);
        }
      }
      let area = 0;
      for (let e = -87.5; e < 90; e += 5) area += 72 * Math.cos((e * Math.PI) / 180);
      expect(Math.abs(10 * Math.log10(sum / area))).toBeLessThan(limitDb);
    }
  });

  it('meet both cuts without a step', () => {
    const antenna = new Scene().antennas.aut.antenna;
    for (let a = -180; a <= 180; a += 11) {
      const on = antenna.complexGain(868e6, a, 0).co;
      const off = antenna.complexGain(868e6, a, 1e-9).co;
      expect(Math.hypot(on.re - off.re, on.im - off.im)).toBeLessThan(1e-8);
    }
  });
});
