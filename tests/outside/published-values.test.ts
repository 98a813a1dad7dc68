// Published values against the pattern mathematics. Patterns are sampled from the published formula, so that
// a wrong beamwidth reader fails here; tolerances are those of the entry, never wider.
import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { beamwidth } from '../../daemon/pattern/beamwidth.ts';
import type { Cut } from '../../daemon/pattern/cut.ts';
import {
  amplitudeDb,
  amplitudeRatio,
  halfPowerDb,
  powerDb,
  powerRatio,
} from '../../daemon/pattern/decibels.ts';
import { lobingHeightM, rippleDb } from '../../daemon/pattern/echo.ts';
import { extremaOf } from '../../daemon/pattern/extrema.ts';
import { edgePhaseDeg, farFieldDistanceM, reactiveLimitM } from '../../daemon/pattern/far-field.ts';
import type { Figure } from '../../daemon/pattern/figure.ts';
import { cutFigures } from '../../daemon/pattern/figures.ts';
import { flagMarginDb } from '../../daemon/pattern/floor.ts';
import {
  freeSpaceLossDb,
  gainSumDbi,
  threeAntennaGainsDbi,
  transmissionDb,
  wavelengthM,
} from '../../daemon/pattern/friis.ts';
import { gainConstantDb, ieeeGainDbi, realizedGainDbi } from '../../daemon/pattern/gain-transfer.ts';
import { levelAt } from '../../daemon/pattern/level-at.ts';
import {
  gammaOfReturnLoss,
  gammaOfVswr,
  mismatchLossDb,
  returnLossDb,
  vswr,
} from '../../daemon/pattern/match.ts';
import { lengthScale } from '../../daemon/pattern/match-band.ts';
import {
  aliasFreePathM,
  echoPeriodHz,
  kaiser6Widening,
  pathResolutionM,
} from '../../daemon/pattern/path-resolution.ts';
import { peakOf } from '../../daemon/pattern/peak.ts';
import {
  densityDistanceM,
  eirpW,
  fccPublicWM2,
  icnirpPublicWM2,
} from '../../daemon/pattern/power-density.ts';
import { lobesOf } from '../../daemon/pattern/side-lobes.ts';
import { noiseDbm } from '../../daemon/plan/preflight/link-budget.ts';
import { notCovered } from './not-covered.ts';
import {
  cardioid,
  chebyshevArray,
  circularAperture,
  cosPower,
  dipole,
  lineSources,
  sampledCut,
  sinPower,
  taylorLineSource,
  uniformArray,
} from './pattern-formulas.ts';

type Numbers = (number | null)[];
interface Entry {
  id: string;
  quantity: string;
  // biome-ignore lint/suspicious/noExplicitAny: each entry has its own shape, read by its own check.
  value: any;
  // biome-ignore lint/suspicious/noExplicitAny: as above.
  inputs?: any;
  // biome-ignore lint/suspicious/noExplicitAny: a number, a list or a record, by entry.
  tolerance: any;
  source: string;
  status: string;
}

const file = new URL('published-values.json', import.meta.url);
const { entries } = JSON.parse(readFileSync(file, 'utf8')) as { entries: Entry[] };

function near(
  actual: number | Figure,
  expected: number | null | undefined,
  tolerance: number,
  what = '',
): void {
  const value = typeof actual === 'number' ? actual : actual.kind === 'absent' ? Number.NaN : actual.value;
  if (typeof actual !== 'number') expect(actual.kind, `${what} ${JSON.stringify(actual)}`).toBe('value');
  expect(typeof expected, what).toBe('number');
  expect(typeof tolerance, `${what}: tolerance`).toBe('number');
  expect(Math.abs(value - expected!), `${what}: ${value} for ${expected}`).toBeLessThanOrEqual(tolerance);
}

/** Width in degrees at a drop, read against the refined peak. */
function widthDeg(cut: Cut, dropDb: number): number {
  const width = beamwidth(cut, peakOf(cut), { dropDb });
  return width.kind === 'value' ? width.value : Number.NaN;
}

function lobeLevelsDb(cut: Cut): number[] {
  const peak = peakOf(cut);
  const right = extremaOf(cut, peak).right.filter((found) => found.kind === 'lobe');
  return right.map((lobe) => lobe.levelDb - peak.levelDb);
}

/** A field against x = (L/λ) sin t, small angles: the angle is x/L; widths × L/λ are the constants. */
const length = 50;
const smallAngle = (field: (x: number) => number, reach = 6, step = 0.001): Cut =>
  sampledCut(
    (t) => field(t * length),
    (-reach / length) * deg,
    (reach / length) * deg,
    (step / length) * deg,
  );
const deg = 180 / Math.PI;

const checks: Record<string, (entry: Entry) => void> = {
  'A-DIP-SHORT-HPBW': ({ value, tolerance }) => {
    near(cutFigures(sampledCut(sinPower(2), 0, 180, 0.5)).halfPowerBeamwidthDeg, value, tolerance);
  },
  'A-DIP-LENGTH': ({ value, tolerance }) => {
    for (const [wavelengths, , , peakDeg, hpbwDeg] of value as number[][]) {
      // The dipole of 1.5 wavelengths has two like lobes; one of them is cut out.
      const figures = cutFigures(sampledCut(dipole(wavelengths!), 0, wavelengths! > 1.3 ? 90 : 180, 0.1));
      near(figures.peakDeg, peakDeg, tolerance.deg, `${wavelengths} peak`);
      near(figures.halfPowerBeamwidthDeg, hpbwDeg, tolerance.deg, `${wavelengths} HPBW`);
    }
  },
  'A-DIP-HALF-HPBW': ({ value, tolerance }) => {
    near(cutFigures(sampledCut(dipole(0.5), 0, 180, 1)).halfPowerBeamwidthDeg, value, tolerance);
  },
  'A-DIP-HALF-PTS': ({ value, tolerance }) => {
    const cut = sampledCut(dipole(0.5), 0, 180, 0.1);
    for (const [elevationDeg, db] of value as number[][]) {
      near(relativeAt(cut, 90 - elevationDeg!), db, tolerance, `${elevationDeg}°`);
    }
  },
  'A-CARD': ({ value: [, hpbwDeg, sideDb], tolerance }) => {
    const cut = sampledCut(cardioid, -180, 180, 0.1);
    const figures = cutFigures(cut);
    near(figures.halfPowerBeamwidthDeg, hpbwDeg, tolerance.deg);
    near(relativeAt(cut, 90), sideDb, tolerance.db);
    near(relativeAt(cut, -90), sideDb, tolerance.db);
    // An exact null behind: infinite in the table, a bound from any cut.
    expect(figures.frontToBackDb).toMatchObject({ kind: 'bound', bound: 'lower' });
    expect(figures.firstSideLobeLeftDb.kind).toBe('absent');
  },
  'A-COSQ': ({ value, tolerance }) => {
    for (const [q, , , hpbwDeg, tenDbDeg] of value as number[][]) {
      const figures = cutFigures(sampledCut(cosPower(q!), -180, 180, 0.1));
      near(figures.halfPowerBeamwidthDeg, hpbwDeg, tolerance.deg, `q ${q}`);
      near(figures.tenDbBeamwidthDeg, tenDbDeg, tolerance.deg, `q ${q}, 10 dB`);
    }
  },
  'A-SINQ': ({ value, tolerance }) => {
    for (const [q, , , hpbwDeg] of value as number[][]) {
      const figures = cutFigures(sampledCut(sinPower(q!), 0, 180, 0.1));
      near(figures.halfPowerBeamwidthDeg, hpbwDeg, tolerance.deg, `q ${q}`);
    }
  },
  'A-GAUSS': ({ value, tolerance, inputs }) => {
    const gauss = (t: number) => 10 ** ((-3.010299957 * ((2 * t * deg) / 30) ** 2) / 20);
    const cut = sampledCut(gauss, -60, 60, 0.01);
    (inputs.levels_db as number[]).forEach((levelDb, k) => {
      near(widthDeg(cut, -levelDb) / widthDeg(cut, halfPowerDb), value[k], tolerance, `${levelDb} dB`);
    });
  },
  'A-LINE-HPBW': ({ value, tolerance }) => {
    const figure = cutFigures(smallAngle(lineSources['uniform']!)).halfPowerBeamwidthDeg;
    near((numberOf(figure) / deg) * length, value, tolerance);
  },
  'A-LINE-HPBW-DEG': ({ value, tolerance }) => {
    near(
      numberOf(cutFigures(smallAngle(lineSources['uniform']!)).halfPowerBeamwidthDeg) * length,
      value,
      tolerance,
    );
  },
  'A-LINE-FNBW': ({ value, tolerance }) => {
    const width = numberOf(cutFigures(smallAngle(lineSources['uniform']!)).firstNullBeamwidthDeg) * length;
    near(width / deg, value[0], tolerance[0]);
    near(width, value[1], tolerance[1]);
    // The same nulls between the samples: steps that miss them.
    const missed = smallAngle(lineSources['uniform']!, 6 + 0.0003, 0.001);
    near(numberOf(cutFigures(missed).firstNullBeamwidthDeg) * length, value[1], tolerance[1]);
  },
  'A-LINE-SLL': ({ value, tolerance }) => {
    const levels = lobeLevelsDb(smallAngle(lineSources['uniform']!));
    (value as number[]).forEach((db, k) => {
      near(levels[k]!, db, tolerance, `lobe ${k + 1}`);
    });
  },
  'A-LINE-L10': ({ value, tolerance }) => {
    const cut = sampledCut((t) => lineSources['uniform']!(10 * Math.sin(t)), -90, 90, 0.02);
    const figures = cutFigures(cut);
    near(figures.halfPowerBeamwidthDeg, value[0], tolerance);
    near(figures.firstNullBeamwidthDeg, value[1], tolerance);
    const lobe = extremaOf(cut, peakOf(cut)).right.find((found) => found.kind === 'lobe');
    near(lobe!.angleDeg, value[2], tolerance);
  },
  'A-SINC-PTS': ({ value, tolerance }) => {
    const cut = smallAngle(lineSources['uniform']!);
    for (const [x, db] of value as Numbers[]) {
      const found = relativeAt(cut, (x! / length) * deg);
      if (db === null) expect(numberOf(found)).toBeLessThan(-60);
      else near(found, db, tolerance, `x ${x}`);
    }
  },
  'A-TAPER': ({ value, tolerance }) => {
    for (const [taper, hpbwRad, hpbwDeg, fnbwRad, fnbwDeg, lobes] of value) {
      // A step with no sample 120 dB down, where a null of second order would be held level.
      const cut = smallAngle(lineSources[taper]!, 6.4, 0.0008);
      const figures = cutFigures(cut);
      const [hpbw, fnbw] = [
        numberOf(figures.halfPowerBeamwidthDeg) * length,
        numberOf(figures.firstNullBeamwidthDeg) * length,
      ];
      near(hpbw / deg, hpbwRad, tolerance.rad, taper);
      near(hpbw, hpbwDeg, tolerance.deg, taper);
      near(fnbw / deg, fnbwRad, tolerance.rad, taper);
      near(fnbw, fnbwDeg, tolerance.deg, taper);
      const levels = lobeLevelsDb(smallAngle(lineSources[taper]!, 9));
      (lobes as number[]).forEach((db, k) => {
        near(levels[k]!, db, tolerance.db, `${taper} ${k}`);
      });
    }
  },
  'A-TAPER-COS-RATIO': ({ value, tolerance }) => {
    const cosine = numberOf(cutFigures(smallAngle(lineSources['cosine']!)).halfPowerBeamwidthDeg);
    const uniform = numberOf(cutFigures(smallAngle(lineSources['uniform']!)).halfPowerBeamwidthDeg);
    near(cosine / uniform, value[1], tolerance[1]);
  },
  'A-CIRC-HPBW': ({ value, tolerance }) => {
    const width = numberOf(cutFigures(smallAngle(circularAperture)).halfPowerBeamwidthDeg) * length;
    near(width / deg, value[0], tolerance[0]);
    near(width, value[1], tolerance[1]);
  },
  'A-CIRC-FNBW': ({ value, tolerance }) => {
    const width = numberOf(cutFigures(smallAngle(circularAperture)).firstNullBeamwidthDeg) * length;
    near(width / deg, value[0], tolerance[0]);
    near(width, value[1], tolerance[1]);
  },
  'A-CIRC-SLL': ({ value, tolerance }) => {
    const levels = lobeLevelsDb(smallAngle(circularAperture));
    (value as number[]).forEach((db, k) => {
      near(levels[k]!, db, tolerance, `lobe ${k + 1}`);
    });
  },
  'A-ARR-BROAD': ({ value, tolerance }) => {
    for (const [n, spacing, , , hpbwDeg, fnbwDeg, lobeDb] of value as number[][]) {
      const offBroadside = (t: number) => uniformArray(n!, spacing!, 0)(Math.PI / 2 - t);
      const figures = cutFigures(sampledCut(offBroadside, -90, 90, 0.05));
      near(figures.halfPowerBeamwidthDeg, hpbwDeg, tolerance.deg, `N ${n}`);
      near(figures.firstNullBeamwidthDeg, fnbwDeg, tolerance.deg, `N ${n}, nulls`);
      near(figures.sideLobeLevelDb, lobeDb, tolerance.db, `N ${n}, lobe`);
    }
  },
  'A-ARR-END': ({ value, tolerance }) => {
    const steps = [-Math.PI / 2, -(Math.PI / 2 + 0.294), -(Math.PI / 2 + Math.PI / 10)];
    (value as number[][]).forEach(([, , hpbwDeg, lobeDb], k) => {
      const figures = cutFigures(sampledCut(uniformArray(10, 0.25, steps[k]!), -180, 180, 0.1));
      near(figures.halfPowerBeamwidthDeg, hpbwDeg, tolerance.deg, `row ${k}`);
      near(figures.sideLobeLevelDb, lobeDb, tolerance.db, `row ${k}, lobe`);
    });
  },
  'A-CHEB10-HPBW': ({ value, tolerance }) => {
    near(
      cutFigures(sampledCut(chebyshevArray(10, 20), -90, 90, 0.05)).halfPowerBeamwidthDeg,
      value[0],
      tolerance,
    );
  },
  'A-CHEB10-SLL': ({ value, tolerance }) => {
    const cut = sampledCut(chebyshevArray(10, 20), -90, 90, 0.05);
    near(cutFigures(cut).sideLobeLevelDb, value, tolerance);
    const lobes = lobesOf(extremaOf(cut, peakOf(cut)));
    expect(lobes).toHaveLength(8);
    for (const lobe of lobes) near(lobe.levelDb - peakOf(cut).levelDb, value, tolerance, `${lobe.angleDeg}°`);
  },
  'A-CHEB10-PTS': ({ value, tolerance }) => {
    const cut = sampledCut(chebyshevArray(10, 20), -90, 90, 0.05);
    for (const [angleDeg, db] of value as Numbers[]) {
      const found = relativeAt(cut, angleDeg!);
      if (db === null) expect(numberOf(found)).toBeLessThan(-100);
      else near(found, db, tolerance, `${angleDeg}°`);
    }
  },
  'A-TAYLOR': ({ value, tolerance }) => {
    const field = taylorLineSource(10, 5);
    const cut = sampledCut((t) => field(7 * Math.sin(t)), -90, 90, 0.02);
    near(cutFigures(cut).halfPowerBeamwidthDeg, value.hpbw_exact_deg, tolerance.deg);
    const turns = extremaOf(cut, peakOf(cut)).right;
    const nulls = turns.filter((found) => found.kind === 'null');
    (value.nulls_u as number[]).forEach((u, k) => {
      near(7 * Math.sin(nulls[k]!.angleDeg / deg), u, tolerance.u, `null ${k}`);
    });
    const levels = lobeLevelsDb(cut);
    (value.sidelobes_db as number[]).forEach((db, k) => {
      near(levels[k]!, db, tolerance.db, `lobe ${k}`);
    });
  },
  'C-FRIIS-1': ({ value, tolerance, inputs }) => {
    const sent = numberOf(realizedGainDbi(inputs.gt_db, 'ieee', inputs.gamma_t));
    const received = numberOf(realizedGainDbi(inputs.gr_db, 'ieee', inputs.gamma_r));
    const distanceM = inputs.separation_wavelengths * wavelengthM(1e9);
    const levelDb = transmissionDb(sent, received, distanceM, 1e9);
    near(1000 * inputs.pt_w * powerRatio(levelDb), value, tolerance);
  },
  'C-FRIIS-2': ({ value, tolerance, inputs }) => {
    near(transmissionDb(inputs.g1_dbi, inputs.g2_dbi, inputs.d_m, inputs.f_hz), value, tolerance);
  },
  'C-FRIIS-3': ({ value, tolerance, inputs }) => {
    const [first, second] = inputs.g_dbi as [number, number];
    const levelDb = transmissionDb(first, second, inputs.d_m, inputs.f_hz);
    near(inputs.pt_dbm + levelDb - inputs.cable_db[0] - inputs.cable_db[1], value, tolerance);
  },
  'C-2ANT': ({ value, tolerance, inputs }) => {
    near(gainSumDbi(inputs.s21_db, inputs.d_m, inputs.f_hz) / 2, value, tolerance);
  },
  'C-3ANT': ({ value, tolerance, inputs }) => {
    const sum = (levelDb: number) => gainSumDbi(levelDb, inputs.d_m, inputs.f_hz);
    const gains = threeAntennaGainsDbi(sum(inputs.s21_ab_db), sum(inputs.s21_ac_db), sum(inputs.s21_bc_db));
    gains.forEach((gainDbi, k) => {
      near(gainDbi, value[k], tolerance, `antenna ${k}`);
    });
    near(freeSpaceLossDb(inputs.d_m, inputs.f_hz), inputs.fspl_db, tolerance);
  },
  'C-SUBST': ({ value, tolerance, inputs }) => {
    const constant = (referenceGainDbi: number) =>
      gainConstantDb({ referenceGainDbi, referenceLevelDb: inputs.reading_standard_dbm });
    near(inputs.reading_aut_dbm + constant(inputs.standard_gain_dbi), value.uncorrected_dbi, tolerance);
    const standard = numberOf(realizedGainDbi(inputs.standard_gain_dbi, 'ieee', inputs.gamma_standard));
    const realized = inputs.reading_aut_dbm + constant(standard);
    near(ieeeGainDbi(realized, inputs.gamma_aut), value.corrected_dbi, tolerance);
  },
  'C-FAR': ({ value, tolerance }) => {
    for (const [sizeM, mhz, lambdaM, farM, reactiveM, radianM] of value as number[][]) {
      near(wavelengthM(mhz! * 1e6), lambdaM, lambdaM! * tolerance.rel);
      near(farFieldDistanceM(sizeM!, mhz! * 1e6), farM, farM! * tolerance.rel);
      near(reactiveLimitM(sizeM!, mhz! * 1e6), reactiveM, reactiveM! * tolerance.rel);
      near(wavelengthM(mhz! * 1e6) / (2 * Math.PI), radianM, radianM! * tolerance.rel);
    }
  },
  'C-PHASE': ({ value, tolerance }) => {
    // The table is the quadratic limit: an antenna of a thousand wavelengths is in it.
    const sizeM = 1000 * wavelengthM(10e9);
    for (const [k, phaseDeg] of value as number[][]) {
      const distanceM = (k! * farFieldDistanceM(sizeM, 10e9)) / 2;
      near(edgePhaseDeg(sizeM, distanceM, 10e9), phaseDeg, tolerance, `k ${k}`);
    }
  },
  'C-PHASE-EXACT': ({ value, tolerance }) => {
    near(edgePhaseDeg(1, farFieldDistanceM(1, 10e9), 10e9), value, tolerance);
  },
  'C-FSPL': ({ value, tolerance }) => {
    const distances = [1, 3, 5, 10, 30, 100, 1000];
    for (const [mhz, ...losses] of value as number[][]) {
      expect(losses).toHaveLength(distances.length);
      losses.forEach((lossDb, k) => {
        near(freeSpaceLossDb(distances[k]!, mhz! * 1e6), lossDb, tolerance, `${mhz} MHz`);
      });
    }
  },
  'C-FSPL-CONST': ({ value, tolerance }) => near(freeSpaceLossDb(1000, 1e6), value, tolerance),
  'C-MATCH': ({ value, tolerance }) => {
    for (const [lossDb, gamma, ratio, mismatchDb, acceptedPercent] of value as number[][]) {
      const found = gammaOfReturnLoss(lossDb!);
      near(found, gamma, tolerance.gamma, `${lossDb} dB`);
      near(returnLossDb(found), lossDb, tolerance.db);
      near(vswr(found), ratio, tolerance.vswr, `${lossDb} dB, VSWR`);
      near(mismatchLossDb(found), mismatchDb, tolerance.db);
      // No tolerance is stated for the percentage: one unit of its last printed digit.
      near(100 * powerRatio(-numberOf(mismatchLossDb(found))), acceptedPercent, 0.001);
    }
  },
  'C-VSWR': ({ value, tolerance }) => {
    for (const [ratio, gamma, lossDb, mismatchDb] of value as Numbers[]) {
      const found = gammaOfVswr(ratio!);
      near(found, gamma, tolerance.gamma, `VSWR ${ratio}`);
      near(mismatchLossDb(found), mismatchDb, tolerance.db);
      if (lossDb === null) expect(returnLossDb(found)).toMatchObject({ kind: 'bound', bound: 'lower' });
      else near(returnLossDb(found), lossDb, tolerance.db);
    }
  },
  'C-RIPPLE': ({ value, tolerance }) => {
    for (const [levelDb, maxDb, minDb, peakToPeakDb] of value as number[][]) {
      const { risesDb, fallsDb } = rippleDb(levelDb!);
      near(risesDb, maxDb, tolerance, `${levelDb} dB`);
      near(fallsDb, minDb, tolerance, `${levelDb} dB`);
      near(risesDb - fallsDb, peakToPeakDb, tolerance, `${levelDb} dB`);
    }
  },
  'C-SNR-AVG': ({ value, tolerance }) => {
    const floor = { levelDbm: -110, ifBandwidthHz: 1000 };
    [2, 4, 10, 16, 100].forEach((averages, k) => {
      near(-110 - noiseDbm(floor, { ifBandwidthHz: 1000, averages }), value[k], tolerance, `${averages}`);
    });
  },
  'E-FCC-PTS': ({ value, tolerance }) => {
    for (const [mhz, generalWM2] of value as number[][]) {
      near(fccPublicWM2(mhz! * 1e6), generalWM2, tolerance, `${mhz} MHz`);
    }
  },
  'E-ICNIRP-PTS': ({ value, tolerance }) => {
    for (const [mhz, generalWM2] of value as number[][]) {
      near(icnirpPublicWM2(mhz! * 1e6), generalWM2, tolerance, `${mhz} MHz`);
    }
  },
  'E-DIST': ({ value, tolerance }) => {
    for (const [mhz, powerW, gainDbi, radiatedW, ...distancesM] of value as number[][]) {
      const found = eirpW(powerDb(powerW!) + 30, gainDbi!);
      // Printed to six digits.
      near(found / radiatedW!, 1, 1e-5, `${mhz} MHz, EIRP`);
      const [fcc, fccOccupational] = publishedRow('E-FCC-PTS', mhz!);
      const [icnirp, icnirpOccupational] = publishedRow('E-ICNIRP-PTS', mhz!);
      const expected = [
        densityDistanceM(found, fcc!),
        densityDistanceM(found, fccOccupational!),
        densityDistanceM(found, icnirp!),
        densityDistanceM(found, icnirpOccupational!),
        densityDistanceM(found, fcc!, 2.56),
        densityDistanceM(found, fcc!, 4),
      ];
      expect(distancesM).toHaveLength(expected.length);
      expected.forEach((distanceM, k) => {
        near(distanceM, distancesM[k], tolerance, `${mhz} MHz, column ${k}`);
      });
    }
  },
  'E-OET-FACTOR': ({ value, tolerance }) => {
    for (const [factor, db] of value as number[][]) {
      const more = (densityDistanceM(1, 1, factor) / densityDistanceM(1, 1)) ** 2;
      near(more, factor, tolerance);
      near(powerDb(more), db, tolerance);
    }
  },
  'E-OET-EX': ({ value, tolerance, inputs }) => {
    const meanDbm = powerDb(inputs.power_w * inputs.duty) + 30;
    near(densityDistanceM(eirpW(meanDbm, inputs.gain_dbi), inputs.limit_w_m2), value, tolerance);
  },
  'G-KAISER-MET': ({ value, tolerance }) => {
    const width = (beta: number): number => (value as number[][]).find((row) => row[0] === beta)![1]!;
    near(kaiser6Widening, width(6) / width(0), tolerance.bins);
  },
  'G-RES': ({ value, tolerance }) => {
    for (const [mhz, pathM] of value as number[][]) {
      near(pathResolutionM(mhz! * 1e6), pathM, pathM! * tolerance.rel, `${mhz} MHz`);
    }
  },
  'G-ALIAS': ({ value, tolerance }) => {
    for (const [spanMhz, points, stepMhz, pathM] of value as number[][]) {
      near(spanMhz! / (points! - 1), stepMhz, stepMhz! * tolerance.rel);
      near(aliasFreePathM((spanMhz! * 1e6) / (points! - 1)), pathM, pathM! * tolerance.rel, `${points}`);
    }
  },
  'G-ECHO-PERIOD': ({ value, tolerance }) => {
    [0.5, 1, 3, 10].forEach((excessM, k) => {
      near(echoPeriodHz(excessM) / 1e6, value[k], tolerance, `${excessM} m`);
    });
  },
  'I-HEIGHT': ({ value, tolerance }) => {
    for (const [sourceM, rangeM, nullM] of value as number[][]) {
      near(lobingHeightM(868e6, rangeM!, sourceM!), nullM, tolerance);
    }
  },
  'I-MINUS3': ({ value, tolerance }) => {
    near(powerRatio(-3), value[0], tolerance);
    near(powerDb(0.5), value[1], tolerance);
    near(-halfPowerDb, value[1], tolerance);
  },
  'I-TABLE': ({ value, tolerance }) => {
    for (const [db, power, field] of value as number[][]) {
      near(powerRatio(db!), power, tolerance);
      near(amplitudeRatio(db!), field, tolerance);
      near(powerDb(powerRatio(db!)), db, tolerance);
      near(amplitudeDb(amplitudeRatio(db!)), db, tolerance);
    }
  },
  'I-SCALE': ({ value, tolerance }) => near(0.164 * lengthScale(851, 868), value, tolerance),
  'I-DOUBLE': ({ value, tolerance }) => near(powerDb(2), value, tolerance),
  'I-NULLMARGIN': ({ value, tolerance }) => near(flagMarginDb, value[0], tolerance),
  'I-INTERP': ({ value, tolerance }) => {
    for (const [step, errorPercent] of value as number[][]) {
      const lobe = (t: number) => 10 ** ((-halfPowerDb * ((2 * t * deg) / 10) ** 2) / 20);
      const reach = Math.ceil(1 / step!) * step! * 10;
      const figure = cutFigures(sampledCut(lobe, -reach, reach, step! * 10)).halfPowerBeamwidthDeg;
      near((numberOf(figure) / 10 - 1) * 100, errorPercent, tolerance, `step ${step}`);
    }
  },
  'I-WAVELENGTH': ({ value, tolerance }) => {
    for (const [mhz, lambdaM, quarterM] of value as number[][]) {
      near(wavelengthM(mhz! * 1e6), lambdaM, tolerance);
      near(wavelengthM(mhz! * 1e6) / 4, quarterM, tolerance);
    }
  },
  'I-DBM': ({ value, tolerance }) => {
    [0, 14, 20, 27, 30].forEach((dbm, k) => {
      near(powerRatio(dbm), value[k], tolerance, `${dbm} dBm`);
    });
  },
};

describe('published values', () => {
  for (const entry of entries) {
    const check = checks[entry.id];
    if (!check) continue;
    it(`${entry.id}: ${entry.quantity} (${entry.source})`, () => check(entry));
  }

  it('are all either checked or listed as not covered, with the part that is not', () => {
    const whole = notCovered.filter((item) => item.part === undefined).map((item) => item.id);
    const parts = notCovered.filter((item) => item.part !== undefined).map((item) => item.id);
    expect([...Object.keys(checks), ...whole].sort()).toEqual(entries.map((entry) => entry.id).sort());
    expect(parts.filter((id) => !(id in checks))).toEqual([]);
    for (const { because } of notCovered) expect(because.length).toBeGreaterThan(10);
  });

  it('all name their source and say where it stands', () => {
    for (const { id, source, status } of entries) {
      expect(source, id).toMatch(/\w{4}/);
      expect(['computed', 'seen in a copy of the source', 'from memory'], id).toContain(status);
    }
  });
});

/** The limits of a published table at one of its frequencies. */
function publishedRow(id: string, mhz: number): number[] {
  const rows = entries.find((entry) => entry.id === id)!.value as number[][];
  return rows.find((row) => row[0] === mhz)!.slice(1);
}

function numberOf(figure: Figure): number {
  expect(figure.kind, JSON.stringify(figure)).toBe('value');
  return figure.kind === 'value' ? figure.value : Number.NaN;
}

function relativeAt(cut: Cut, angleDeg: number): Figure {
  const found = levelAt(cut, angleDeg);
  return found.kind === 'value' ? { ...found, value: found.value - peakOf(cut).levelDb } : found;
}
