// Cuts of four wire antennas from a method-of-moments program, against figures that a separate reader took
// from finer cuts of the same wires. The fixtures carry the deck and say how each figure was read.
import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { wrapDeg } from '../../daemon/pattern/angles.ts';
import { cutFromSamples } from '../../daemon/pattern/cut.ts';
import { extremaOf } from '../../daemon/pattern/extrema.ts';
import type { Figure } from '../../daemon/pattern/figure.ts';
import { cutFigures } from '../../daemon/pattern/figures.ts';
import { impedance, returnLossDb, vswr } from '../../daemon/pattern/match.ts';
import { bestMatch, matchedBand, type Reflection, resonance } from '../../daemon/pattern/match-band.ts';
import { peakOf } from '../../daemon/pattern/peak.ts';
import { lobesOf } from '../../daemon/pattern/side-lobes.ts';

interface Expected {
  peak_gain_dbi: number;
  peak_angle_deg: number | null;
  hpbw_deg: number | null;
  hpbw_read_from_1deg_cut_deg: number | null;
  beamwidth_10db_deg: number | null;
  front_to_back_180_db: number;
  front_to_rear_sector_db: number;
  max_minus_min_db: number | null;
  local_maxima: [number, number][];
}
interface SweepPoint {
  frequency_hz: number;
  r_ohm: number;
  x_ohm: number;
  gamma_mag: number;
  gamma_deg: number;
  return_loss_db: number;
  vswr: number;
}
interface Antenna {
  expected: Record<'azimuth' | 'elevation', Expected>;
  tolerance: { gain_db: number; hpbw_deg: number; front_to_back_db: number; impedance_ohm: number };
  impedanceSweep: SweepPoint[];
  azimuth: { gainDbi: number[] };
  elevation: { gainDbi: number[] };
}

const load = (name: string) =>
  JSON.parse(readFileSync(new URL(`fixtures/nec-${name}-868.json`, import.meta.url), 'utf8')) as Antenna;

function near(figure: Figure, expected: number, tolerance: number): void {
  expect(figure.kind, JSON.stringify(figure)).toBe('value');
  if (figure.kind === 'value') expect(Math.abs(figure.value - expected)).toBeLessThanOrEqual(tolerance);
}

function cutOf(gainDbi: number[]) {
  return cutFromSamples({ anglesDeg: gainDbi.map((_, k) => k), levelDb: gainDbi }).cut;
}

describe.each(['yagi5', 'yagi3', 'groundplane', 'dipole'])('NEC-2 cuts every degree: %s', (name) => {
  const antenna = load(name);
  const { tolerance } = antenna;

  describe.each(['azimuth', 'elevation'] as const)('%s', (plane) => {
    const expected = antenna.expected[plane];
    const cut = cutOf(antenna[plane].gainDbi);
    const figures = cutFigures(cut, { gainConstantDb: 0 });

    it('is a full turn with the gain of the finer cut', () => {
      expect(cut.periodic).toBe(true);
      near(figures.realizedGainDbi!, expected.peak_gain_dbi, tolerance.gain_db);
      if (expected.peak_angle_deg !== null) near(figures.peakDeg, expected.peak_angle_deg, 1);
    });

    it('has the beamwidths of the finer cut, or none', () => {
      if (expected.hpbw_deg === null) {
        expect(figures.halfPowerBeamwidthDeg).toMatchObject({
          kind: 'absent',
          because: expect.stringContaining('omnidirectional'),
        });
        expect(figures.tenDbBeamwidthDeg.kind).toBe('absent');
        return;
      }
      near(figures.halfPowerBeamwidthDeg, expected.hpbw_deg, tolerance.hpbw_deg);
      // The separate reader on this very cut: equal but for the top, which it takes from one sample.
      near(figures.halfPowerBeamwidthDeg, expected.hpbw_read_from_1deg_cut_deg!, 0.02);
      near(figures.tenDbBeamwidthDeg, expected.beamwidth_10db_deg!, tolerance.hpbw_deg);
    });

    it('has the front-to-back and front-to-rear of the finer cut', () => {
      if (figures.peakDeg.kind === 'absent') {
        expect(figures.frontToBackDb.kind).toBe('absent');
        return;
      }
      near(figures.frontToBackDb, expected.front_to_back_180_db, tolerance.front_to_back_db);
      near(figures.frontToRearDb, expected.front_to_rear_sector_db, tolerance.front_to_back_db);
    });

    it('has the lobes of the finer cut', () => {
      const peak = peakOf(cut);
      // The list holds a lobe that stands out by 0.508 dB, from −26.028 to −25.520.
      const found = lobesOf(extremaOf(cut, peak, { prominenceDb: 0.5 }));
      const listed = expected.local_maxima.filter(([deg]) => Math.abs(wrapDeg(deg - peak.angleDeg)) > 1);
      for (const [deg, dbi] of listed) {
        const lobe = found.find(({ angleDeg }) => Math.abs(wrapDeg(angleDeg - deg)) <= 1);
        expect(lobe, `lobe at ${deg}°`).toBeDefined();
        expect(Math.abs(lobe!.levelDb - dbi)).toBeLessThanOrEqual(tolerance.gain_db);
      }
      expect(found).toHaveLength(listed.length);
    });
  });

  it('has the impedance, return loss and VSWR of the sweep', () => {
    for (const point of antenna.impedanceSweep) {
      const angle = (point.gamma_deg * Math.PI) / 180;
      const z = impedance(point.gamma_mag * Math.cos(angle), point.gamma_mag * Math.sin(angle));
      expect(z.kind).toBe('value');
      if (z.kind !== 'value') continue;
      // Γ is printed to five decimals and the angle to three: near |Γ| of 1 that is more than the stated 0.05 Ω.
      const printedOhm = (50 * 2 * (0.000005 + (0.0005 * Math.PI) / 180)) / (1 - point.gamma_mag) ** 2;
      expect(Math.abs(z.resistanceOhm - point.r_ohm)).toBeLessThanOrEqual(
        Math.min(tolerance.impedance_ohm, printedOhm + 0.0005),
      );
      expect(Math.abs(z.reactanceOhm - point.x_ohm)).toBeLessThanOrEqual(
        Math.min(tolerance.impedance_ohm, printedOhm + 0.0005),
      );
      near(returnLossDb(point.gamma_mag), point.return_loss_db, 0.001);
      near(vswr(point.gamma_mag), point.vswr, point.vswr ** 2 * 0.00001 + 0.00005);
    }
  });
});

describe('NEC-2 impedance over the band', () => {
  const reflection = (name: string): Reflection => {
    const sweep = load(name).impedanceSweep;
    return {
      frequenciesHz: Float64Array.from(sweep, (point) => point.frequency_hz),
      s11: Float64Array.from(
        sweep.flatMap(({ gamma_mag, gamma_deg }) => [
          gamma_mag * Math.cos((gamma_deg * Math.PI) / 180),
          gamma_mag * Math.sin((gamma_deg * Math.PI) / 180),
        ]),
      ),
    };
  };

  it('tells the dipole’s resonance from its best match', () => {
    // The straight line between X = −1.231 Ω at 855 MHz and 2.782 Ω at 860 MHz is zero at 856.53 MHz.
    near(resonance(reflection('dipole')), 855e6 + (5e6 * 1.231) / (1.231 + 2.782), 2000);
    const best = bestMatch(reflection('dipole'));
    // The table's least |S11| is at 850 MHz; the two neighbours are uneven by enough to place it at 849.5.
    near(best.frequencyHz, 849.5e6, 0.1e6);
    near(best.returnLossDb, 15.225, 0.001);
  });

  it('finds the band of the 5-element Yagi for VSWR 2', () => {
    const band = matchedBand(reflection('yagi5'), 2);
    expect(band.startHz).toMatchObject({ kind: 'bound', bound: 'upper', value: 820e6 });
    // Between VSWR 1.8245 at 880 MHz and 2.7378 at 885 MHz, |S11| crosses 1/3.
    const [low, high] = [0.8245 / 2.8245, 1.7378 / 3.7378];
    near(band.stopHz, 880e6 + (5e6 * (1 / 3 - low)) / (high - low), 3000);
    expect(band.widthHz).toMatchObject({ kind: 'bound', bound: 'lower' });
  });
});
