import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { Scene, type ScenePass, type SParameterName } from '../../../../mocks/scene/scene.ts';
import { completeScene, type SceneDescription } from '../../../../mocks/scene/scene-description.ts';
import { SceneError } from '../../../../mocks/scene/scene-error.ts';

const ahead = { azimuthDeg: 0, elevationDeg: 0, rollDeg: 0 };
const quiet = { noise: { snrDb: Infinity, reflectionSnrDb: Infinity } };
const lightspeed = 299_792_458;

function levelDb(z: { re: number; im: number }): number {
  return 10 * Math.log10(z.re ** 2 + z.im ** 2);
}

function isotropic(gainDbi = 0, magnitude = 0) {
  return { kind: 'isotropic' as const, gainDbi, reflection: { magnitude, phaseDeg: 40 } };
}

function between(description: SceneDescription): Scene {
  return new Scene({
    antennas: { aut: isotropic(), reference: isotropic(), range: isotropic() },
    ...quiet,
    ...description,
  });
}

function pass(change: Partial<ScenePass> = {}): ScenePass {
  return {
    parameters: ['S21'],
    frequenciesHz: Float64Array.from({ length: 201 }, (_, i) => 820e6 + i * 500e3),
    pointMs: () => 0,
    poseAt: () => ahead,
    ifBandwidthHz: 1000,
    averages: 1,
    powerDbm: 0,
    sourceOn: true,
    corrected: true,
    ...change,
  };
}

describe('free space', () => {
  // 868 MHz, 3 m, 2.15 and 8.21 dBi: −30.4006 dB by G1 + G2 − 20 log10(4πd/λ) (Friis).
  it('follows Friis', () => {
    const scene = between({
      antennas: { aut: isotropic(8.21), range: isotropic(2.15) },
      rangeLengthM: 3,
    });
    expect(levelDb(scene.s('S21', 868e6, 0, ahead))).toBeCloseTo(-30.4006, 3);
  });

  // Free-space loss by 20 log10(4πdf/c), ITU-R P.525 law: 10 m at 915 MHz 51.676 dB, 100 m at 2450 MHz 80.231 dB.
  it.each([
    [915e6, 10, 51.676],
    [2450e6, 100, 80.231],
  ])('loses %d Hz over %d m: %d dB', (frequencyHz, rangeLengthM, lossDb) => {
    expect(levelDb(between({ rangeLengthM }).s('S12', frequencyHz, 0, ahead))).toBeCloseTo(-lossDb, 3);
  });

  // Γ 0.1 and 0.2 at 100 wavelengths with 16 and 20 dB of gain: 2 W give 4.792 mW
  // (input of Balanis, Antenna Theory, example 2.16, recomputed: the printed 4.777 has rounded steps).
  it('takes both mismatches off', () => {
    const scene = between({
      antennas: { aut: isotropic(16, 0.1), range: isotropic(20, 0.2) },
      rangeLengthM: (100 * lightspeed) / 1e9,
    });
    expect(2000 * 10 ** (levelDb(scene.s('S21', 1e9, 0, ahead)) / 10)).toBeCloseTo(4.792, 2);
  });

  it('turns the phase by one turn per wavelength of range', () => {
    const wavelengthM = lightspeed / 1e9;
    const phase = (rangeLengthM: number): number => {
      const { re, im } = between({ rangeLengthM }).s('S21', 1e9, 0, ahead);
      return (Math.atan2(im, re) * 180) / Math.PI;
    };
    expect(phase(20 * wavelengthM)).toBeCloseTo(0, 6);
    expect(phase(20.25 * wavelengthM)).toBeCloseTo(-90, 6);
  });

  it('reflects what was declared, each antenna at its own port', () => {
    const antennas = { aut: isotropic(0, 0.3), range: isotropic(0, 0.1) };
    for (const autPort of [1, 2] as const) {
      const scene = between({ antennas, autPort });
      const { re, im } = scene.s(autPort === 1 ? 'S11' : 'S22', 868e6, 0, ahead);
      expect(Math.hypot(re, im)).toBeCloseTo(0.3, 12);
      expect((Math.atan2(im, re) * 180) / Math.PI).toBeCloseTo(40, 9);
      expect(levelDb(scene.s(autPort === 1 ? 'S22' : 'S11', 868e6, 0, ahead))).toBeCloseTo(-20, 9);
    }
  });

  it('swaps what is mounted', () => {
    const scene = between({ antennas: { aut: isotropic(9), reference: isotropic(4, 0.5) } });
    const withAut = levelDb(scene.s('S21', 868e6, 0, ahead));
    scene.mount('reference');
    expect(withAut - levelDb(scene.s('S21', 868e6, 0, ahead))).toBeCloseTo(5 - 10 * Math.log10(0.75), 3);
    expect(levelDb(scene.s('S11', 868e6, 0, ahead))).toBeCloseTo(20 * Math.log10(0.5), 9);
  });
});

describe('polarization', () => {
  // Malus: cos² of the angle between linear polarizations; 30° −1.2494, 45° −3.0103, 60° −6.0206 dB.
  it.each([
    [30, -1.2494],
    [45, -3.0103],
    [60, -6.0206],
    [-60, -6.0206],
  ])('rolled by %d°: %d dB', (rollDeg, expected) => {
    const scene = between({ antennas: { aut: { kind: 'yagi5' }, range: isotropic() } });
    const aligned = levelDb(scene.s('S21', 868e6, 0, ahead));
    expect(levelDb(scene.s('S21', 868e6, 0, { ...ahead, rollDeg })) - aligned).toBeCloseTo(expected, 4);
  });

  it('shows the cross-polar level of either antenna at 90° of roll', () => {
    for (const end of ['aut', 'range'] as const) {
      const antennas = { aut: isotropic(), range: isotropic(), [end]: { ...isotropic(), crossPolarDb: 23 } };
      const scene = between({ antennas });
      const co = levelDb(scene.s('S21', 868e6, 0, ahead));
      const cross = levelDb(scene.s('S21', 868e6, 0, { ...ahead, rollDeg: 90 }));
      expect(co - cross).toBeCloseTo(23, 9);
    }
  });
});

describe('the two axes and the roll', () => {
  // A half-wave dipole in its own frame: cos((π/2) sin e)/cos e at elevation e, field along its wire.
  const halfWave = (e: number): number => Math.cos((Math.PI / 2) * Math.sin(e)) / Math.cos(e);
  const antennas = { aut: { kind: 'half-wave-dipole' as const }, range: isotropic() };
  const off = { azimuthDeg: 60, elevationDeg: 30, rollDeg: 0 };

  it('with the turntable on the tilt, a position is a direction', () => {
    const scene = between({ antennas, stacking: 'azimuth-over-elevation' });
    const drop = levelDb(scene.s('S21', 868e6, 0, off)) - levelDb(scene.s('S21', 868e6, 0, ahead));
    // −1.7609 dB at 30° (closed form).
    expect(drop).toBeCloseTo(-1.7609, 3);
  });

  it('with the tilt on the turntable, the direction and the wire’s tilt follow from the turns', () => {
    const scene = between({ antennas, stacking: 'elevation-over-azimuth' });
    const drop = levelDb(scene.s('S21', 868e6, 0, off)) - levelDb(scene.s('S21', 868e6, 0, ahead));
    // The wire leans 30° in the turned plane: sin e = cos 60°·sin 30°; a wave polarized upright meets the
    // field of the wire under an angle whose cosine is cos 30°/cos e.
    const e = Math.asin(0.5 * 0.5);
    expect(drop).toBeCloseTo(20 * Math.log10((halfWave(e) * Math.cos(Math.PI / 6)) / Math.cos(e)), 9);
  });

  it('a line source seen from aside and above follows the direction cosine along the line', () => {
    const wavelengthM = lightspeed / 868e6;
    const aut = { kind: 'line-source' as const, lengthM: 3 * wavelengthM, gainDbi: 0 };
    const scene = between({ antennas: { aut, range: isotropic() } });
    const pose = { azimuthDeg: 30, elevationDeg: 60, rollDeg: 0 };
    const drop = levelDb(scene.s('S21', 868e6, 0, pose)) - levelDb(scene.s('S21', 868e6, 0, ahead));
    // u = π·3·sin 30°·cos 60° = 0.75π.
    expect(drop).toBeCloseTo(20 * Math.log10(Math.sin(0.75 * Math.PI) / (0.75 * Math.PI)), 9);
  });

  it('rolls the range antenna’s pattern with it: up goes to the left as the AUT sees it', () => {
    // A cardioid looking to its own left, which is right for the AUT; rolled by 90° it looks up.
    const range = { kind: 'cardioid' as const, gainDbi: 0, rotateAzimuthDeg: 90 };
    const echoAt = (departureElevationDeg: number): number => {
      const echoes = [{ extraPathM: 0, levelDb: 60, departureElevationDeg }];
      return levelDb(
        between({ antennas: { aut: isotropic(), range }, echoes }).s('S21', 868e6, 0, {
          ...ahead,
          rollDeg: 90,
        }),
      );
    };
    // Field (1 + cos t)/2 at t = 30° and 150°; the direct wave is 60 dB below the echo at least in part.
    const expected = 20 * Math.log10((1 + Math.cos(Math.PI / 6)) / (1 - Math.cos(Math.PI / 6)));
    expect(Math.abs(echoAt(60) - echoAt(-60) - expected)).toBeLessThan(0.2);
  });

  it('adds the range antenna’s cross component across its co component', () => {
    // Cross over co of 0.1 in phase: upright share cos r − 0.1 sin r.
    const range = { ...isotropic(), crossPolarDb: 20 };
    const scene = between({ antennas: { aut: isotropic(), range } });
    const r = Math.PI / 6;
    const drop =
      levelDb(scene.s('S21', 868e6, 0, { ...ahead, rollDeg: 30 })) - levelDb(scene.s('S21', 868e6, 0, ahead));
    expect(drop).toBeCloseTo(20 * Math.log10(Math.cos(r) - 0.1 * Math.sin(r)), 9);
  });

  it('loses in the antenna what its heat takes', () => {
    const lossy = between({ antennas: { aut: { ...isotropic(), lossDb: 1.3 }, range: isotropic() } });
    expect(
      levelDb(lossy.s('S21', 868e6, 0, ahead)) - levelDb(between({}).s('S21', 868e6, 0, ahead)),
    ).toBeCloseTo(-1.3, 9);
  });
});

describe('echoes', () => {
  const band = Float64Array.from({ length: 2001 }, (_, i) => 800e6 + i * 100e3);

  function ripple(description: SceneDescription): { maximaHz: number[]; maxDb: number; minDb: number } {
    const direct = between({
      ...(description.rangeLengthM ? { rangeLengthM: description.rangeLengthM } : {}),
    });
    const scene = between(description);
    const db = Array.from(
      band,
      (f) => levelDb(scene.s('S21', f, 0, ahead)) - levelDb(direct.s('S21', f, 0, ahead)),
    );
    const maximaHz = db.flatMap((v, i) =>
      v > (db[i - 1] ?? Infinity) && v >= (db[i + 1] ?? Infinity) ? [band[i]!] : [],
    );
    return { maximaHz, maxDb: Math.max(...db), minDb: Math.min(...db) };
  }

  // Ripple period c/ΔL: 99.9308 MHz for 3 m, 29.9792 MHz for 10 m (closed form). Extremes of a −20 dB echo
  // +0.8279/−0.9151 dB, of −10 dB +2.3866/−3.3018 dB (two-phasor sum, IEEE Std 149).
  it.each([
    [10, -20, 29.9792e6, 0.8279, -0.9151],
    [3, -10, 99.9308e6, 2.3866, -3.3018],
  ])('%d m longer at %d dB ripples with its period and size', (extraPathM, level, periodHz, maxDb, minDb) => {
    const seen = ripple({ echoes: [{ extraPathM, levelDb: level }] });
    expect(seen.maximaHz.length).toBeGreaterThan(1);
    const apart = (seen.maximaHz.at(-1)! - seen.maximaHz[0]!) / (seen.maximaHz.length - 1);
    // The raster of 100 kHz limits what can be seen.
    expect(Math.abs(apart - periodHz)).toBeLessThan(150e3);
    expect(seen.maxDb).toBeCloseTo(maxDb, 3);
    expect(seen.minDb).toBeCloseTo(minDb, 3);
  });

  // Two rays over flat ground with reflection −1: first null above ground at h = λR/(2·h_s) when the range
  // is long (common practice). The exact heights make both paths differ by one wavelength.
  it('bounces off the ground with the true path difference', () => {
    const [rangeLengthM, rangeAntennaM, autM] = [40, 3, 2];
    const along = Math.sqrt(rangeLengthM ** 2 - 1);
    const bounceM = Math.hypot(along, 5);
    const nullHz = lightspeed / (bounceM - rangeLengthM);
    const scene = between({ rangeLengthM, ground: { rangeAntennaM, autM, reflectionMagnitude: 1 } });
    const direct = levelDb(between({ rangeLengthM }).s('S21', nullHz, 0, ahead));
    // At the null only the difference of spreading is left: 1 − R/L.
    expect(levelDb(scene.s('S21', nullHz, 0, ahead)) - direct).toBeCloseTo(
      20 * Math.log10(1 - rangeLengthM / bounceM),
      3,
    );
    expect(
      levelDb(scene.s('S21', nullHz * 1.5, 0, ahead)) -
        levelDb(between({ rangeLengthM }).s('S21', nullHz * 1.5, 0, ahead)),
    ).toBeCloseTo(20 * Math.log10(1 + rangeLengthM / bounceM), 3);
  });

  it('weights a bounce with the pattern at its own angle below the line of sight', () => {
    // Equal heights of 5 m over 10 m: the bounce comes 45° from below, along 14.14 m.
    const ground = { rangeAntennaM: 5, autM: 5, reflectionMagnitude: 1, reflectionPhaseDeg: 0 };
    const dipole = { kind: 'half-wave-dipole' as const };
    const antennas = { aut: dipole, range: isotropic() };
    const frequencyHz = lightspeed / (Math.SQRT2 * 10 - 10);
    const ratio =
      levelDb(between({ antennas, ground }).s('S21', frequencyHz, 0, ahead)) -
      levelDb(between({ antennas }).s('S21', frequencyHz, 0, ahead));
    // Half-wave dipole at 45°: −4.0417 dB (cos(π/2 sin e)/cos e); spreading 1/√2; in phase.
    expect(ratio).toBeCloseTo(20 * Math.log10(1 + 10 ** (-4.0417 / 20) / Math.SQRT2), 3);
  });

  it('sees a bounce under its angle to a sloping line of sight, at either end', () => {
    // 8 and 2 m high, 10 m apart: 8 m along the ground, the sight slopes by atan(6/8) = 36.87°, the bounce by
    // atan(10/8) = 51.34°: 88.21° off the sight at the AUT, 14.47° at the range antenna; 12.806 m long.
    const ground = { rangeAntennaM: 8, autM: 2, reflectionMagnitude: 1, reflectionPhaseDeg: 0 };
    const dipole = { kind: 'half-wave-dipole' as const };
    const bounceM = Math.hypot(8, 10);
    const frequencyHz = (3 * lightspeed) / (bounceM - 10);
    for (const [end, e] of [
      ['aut', Math.atan2(10, 8) + Math.atan2(6, 8)],
      ['range', Math.atan2(10, 8) - Math.atan2(6, 8)],
    ] as const) {
      const antennas = { aut: isotropic(), range: isotropic(), [end]: dipole };
      const rise =
        levelDb(between({ antennas, ground }).s('S21', frequencyHz, 0, ahead)) -
        levelDb(between({ antennas }).s('S21', frequencyHz, 0, ahead));
      const factor = Math.cos((Math.PI / 2) * Math.sin(e)) / Math.cos(e);
      expect(rise).toBeCloseTo(20 * Math.log10(1 + (factor * 10) / bounceM), 6);
    }
  });

  it('launches towards a wall with the range antenna’s pattern on that side', () => {
    const frequencyHz = 868e6;
    const lengthM = (Math.SQRT2 * lightspeed) / frequencyHz;
    const walls = [{ side: 'left' as const, distanceM: 5, reflectionDb: -6 }];
    const level = (rotateAzimuthDeg: number, withWall: boolean): number => {
      const range = { kind: 'line-source' as const, lengthM, gainDbi: 0, rotateAzimuthDeg };
      const scene = between({ antennas: { aut: isotropic(), range }, walls: withWall ? walls : [] });
      return levelDb(scene.s('S21', frequencyHz, 0, ahead));
    };
    // The null at 45° lies on the wall; turned to its own right the antenna looks at the wall alone.
    expect(level(0, true)).toBeCloseTo(level(0, false), 6);
    expect(level(-45, true) - level(0, false)).toBeCloseTo(-6 - 3.0103, 3);
  });

  it('lets a wall be seen from the side where it stands', () => {
    // Wall 5 m aside over 10 m: its echo arrives 45° from the left, over √2 times the length.
    const frequencyHz = 868e6;
    const wavelengthM = lightspeed / frequencyHz;
    // Null of sin(u)/u at sin(azimuth) = λ/L: L = √2·λ puts it at 45°.
    const aut = { kind: 'line-source' as const, lengthM: Math.SQRT2 * wavelengthM, gainDbi: 0 };
    const walls = [{ side: 'left' as const, distanceM: 5, reflectionDb: -6 }];
    const antennas = { aut, range: isotropic() };
    const with45 = between({ antennas, walls });
    const without = between({ antennas });
    // Straight ahead the wall sits in the null: nothing of it is seen.
    expect(levelDb(with45.s('S21', frequencyHz, 0, ahead))).toBeCloseTo(
      levelDb(without.s('S21', frequencyHz, 0, ahead)),
      6,
    );
    // At azimuth −45° the direct wave sits in the null and the left wall is straight ahead: −6 dB and 1/√2.
    const turned = { ...ahead, azimuthDeg: -45 };
    expect(
      levelDb(with45.s('S21', frequencyHz, 0, turned)) - levelDb(without.s('S21', frequencyHz, 0, ahead)),
    ).toBeCloseTo(-6 - 3.0103, 3);
    // At +45° it is the other side: 90° away from the wall, where this line gives sin(u)/u at u = π√2.
    const u = Math.PI * Math.SQRT2;
    expect(
      levelDb(with45.s('S21', frequencyHz, 0, { ...ahead, azimuthDeg: 45 })) -
        levelDb(without.s('S21', frequencyHz, 0, ahead)),
    ).toBeCloseTo(-6 - 3.0103 + 20 * Math.log10(Math.abs(Math.sin(u) / u)), 3);
  });
});

describe('drift', () => {
  it('runs in straight lines from the start', () => {
    const scene = new Scene({ ...quiet, drift: { dbPerHour: -0.3, degPerHour: 12 } }, 5000);
    const start = scene.s('S21', 868e6, 5000, ahead);
    const later = scene.s('S21', 868e6, 5000 + 1_800_000, ahead);
    expect(levelDb(later) - levelDb(start)).toBeCloseTo(-0.15, 9);
    const turnDeg = ((Math.atan2(later.im, later.re) - Math.atan2(start.im, start.re)) * 180) / Math.PI;
    expect(((turnDeg % 360) + 360) % 360).toBeCloseTo(6, 6);
  });

  it('walks as told, whatever order it is asked in', () => {
    const walk = (seed: number) => new Scene({ ...quiet, seed, drift: { walkDb: 0.2 } });
    const level = (scene: Scene, ms: number): number => levelDb(scene.s('S21', 868e6, ms, ahead));
    const forward = walk(3);
    const backward = walk(3);
    const times = [0, 1e6, 2e6, 3e6];
    const forwards = times.map((ms) => level(forward, ms));
    const backwards = times
      .toReversed()
      .map((ms) => level(backward, ms))
      .toReversed();
    expect(backwards).toEqual(forwards);
    // 400 seeds: the spread after an hour is 0.2 dB; five standard errors of a standard deviation.
    const ends = Array.from(
      { length: 400 },
      (_, seed) => level(walk(seed), 3_600_000) - level(walk(seed), 0),
    );
    const rms = Math.sqrt(ends.reduce((sum, v) => sum + v * v, 0) / ends.length);
    expect(Math.abs(rms - 0.2)).toBeLessThan((5 * 0.2) / Math.sqrt(2 * ends.length));
  });
});

describe('noise', () => {
  function variance(scene: Scene, change: Partial<ScenePass>, parameter: SParameterName = 'S21'): number {
    const frequenciesHz = new Float64Array(20_000).fill(868e6);
    const trace = scene.sweep(pass({ frequenciesHz, parameters: [parameter], ...change })).get(parameter)!;
    const { re, im } = scene.s(parameter, 868e6, 0, ahead);
    let sum = 0;
    for (let i = 0; i < trace.length; i += 2) sum += (trace[i]! - re) ** 2 + (trace[i + 1]! - im) ** 2;
    return sum / frequenciesHz.length;
  }
  // A complex variance from 20 000 readings has a relative standard error of 1/√20000 = 0.7 %: five are 3.5 %.
  const fiveErrors = 0.036;

  it('stands at the stated ratio under the stated settings', () => {
    const scene = new Scene({ noise: { snrDb: 43, reflectionSnrDb: 61 } });
    const signal = 10 ** (levelDb(scene.s('S21', 868e6, 0, ahead)) / 10);
    expect(Math.abs(variance(scene, {}) / (signal * 10 ** -4.3) - 1)).toBeLessThan(fiveErrors);
    expect(Math.abs(variance(scene, {}, 'S11') / 10 ** -6.1 - 1)).toBeLessThan(fiveErrors);
  });

  it.each([
    ['half the IF bandwidth', { ifBandwidthHz: 500 }, 0.5],
    ['four averages', { averages: 4 }, 0.25],
    ['10 dB more power', { powerDbm: 10 }, 0.1],
    ['10 dB less power and ten times the bandwidth', { powerDbm: -10, ifBandwidthHz: 10_000 }, 100],
  ])('follows %s', (_, change, factor) => {
    const scene = new Scene({ noise: { snrDb: 50 } });
    const ratio = variance(scene, change) / variance(scene, {});
    expect(Math.abs(ratio / factor - 1)).toBeLessThan(Math.SQRT2 * fiveErrors);
  });

  it('does not follow the pose: it is the instrument’s', () => {
    const scene = new Scene({ noise: { snrDb: 50 }, antennas: { aut: isotropic(), range: isotropic() } });
    const noisy = new Scene({
      noise: { snrDb: 50 },
      antennas: { aut: { kind: 'cardioid', gainDbi: 0 }, range: isotropic() },
    });
    const back = { ...ahead, azimuthDeg: 180 };
    const trace = noisy
      .sweep(pass({ frequenciesHz: new Float64Array(20_000).fill(868e6), poseAt: () => back }))
      .get('S21')!;
    const power = trace.reduce((sum, v) => sum + v * v, 0) / 20_000;
    expect(Math.abs(power / variance(scene, {}) - 1)).toBeLessThan(Math.SQRT2 * fiveErrors);
  });

  it('is all there is with the source off, and of the order of 1', () => {
    const scene = new Scene();
    const trace = scene.sweep(pass({ sourceOn: false, parameters: ['S11', 'S21'] }));
    for (const values of trace.values()) {
      const magnitudes = Array.from({ length: 201 }, (_, i) =>
        Math.hypot(values[2 * i]!, values[2 * i + 1]!),
      );
      const median = magnitudes.toSorted((a, b) => a - b)[100]!;
      // |ratio|² of two exponentials has median 1.
      expect(median).toBeGreaterThan(0.6);
      expect(median).toBeLessThan(1.7);
    }
  });

  it('repeats itself for one seed and differs for another', () => {
    const run = (seed: number) => new Scene({ seed }).sweep(pass({ parameters: ['S11', 'S21'] }));
    expect(run(4)).toEqual(run(4));
    expect(run(4)).not.toEqual(run(5));
  });
});

describe('a sweep', () => {
  it('measures each point at its own moment and pose', () => {
    const scene = new Scene({ ...quiet, drift: { dbPerHour: 60 } });
    const poseAt = (ms: number) => ({ azimuthDeg: ms / 100, elevationDeg: 0, rollDeg: 0 });
    const moving = pass({ pointMs: (i) => 2000 + 50 * i, poseAt });
    const trace = scene.sweep(moving).get('S21')!;
    for (const i of [0, 1, 77, 200]) {
      const ms = 2000 + 50 * i;
      const { re, im } = scene.s('S21', moving.frequenciesHz[i]!, ms, poseAt(ms));
      expect(Math.abs(trace[2 * i]! - re)).toBeLessThan(1e-12);
      expect(Math.abs(trace[2 * i + 1]! - im)).toBeLessThan(1e-12);
    }
  });

  it('agrees at rest and point by point, at any pose, with echoes', () => {
    const scene = new Scene({
      ...quiet,
      ground: { rangeAntennaM: 2, autM: 2.5, reflectionMagnitude: 0.4 },
      walls: [{ side: 'right', distanceM: 4, reflectionDb: -8 }],
    });
    const angle = fc.double({ min: -180, max: 180, noNaN: true });
    fc.assert(
      fc.property(angle, angle, angle, (azimuthDeg, elevationDeg, rollDeg) => {
        const pose = { azimuthDeg, elevationDeg, rollDeg };
        const at = pass({ poseAt: () => pose });
        const trace = scene.sweep(at).get('S21')!;
        for (const i of [0, 96, 151]) {
          const { re, im } = scene.s('S21', at.frequenciesHz[i]!, 0, pose);
          expect(Math.hypot(trace[2 * i]! - re, trace[2 * i + 1]! - im)).toBeLessThan(1e-12);
        }
      }),
      { numRuns: 30, seed: 1 },
    );
  });

  it('sees the cable once in transmission and twice in reflection when it is not corrected', () => {
    const scene = new Scene({
      ...quiet,
      antennas: { aut: isotropic(0, 0.5), range: isotropic() },
      cable: { lossDb: 1.5, electricalLengthM: 7 },
    });
    const frequenciesHz = Float64Array.of(868e6);
    const both = { parameters: ['S11', 'S21'] as const, frequenciesHz };
    const corrected = scene.sweep(pass(both));
    const raw = scene.sweep(pass({ ...both, corrected: false }));
    for (const [parameter, ways] of [
      ['S11', 2],
      ['S21', 1],
    ] as const) {
      const a = corrected.get(parameter)!;
      const b = raw.get(parameter)!;
      expect(20 * Math.log10(Math.hypot(b[0]!, b[1]!) / Math.hypot(a[0]!, a[1]!))).toBeCloseTo(
        -1.5 * ways,
        9,
      );
      const turns = (Math.atan2(b[1]!, b[0]!) - Math.atan2(a[1]!, a[0]!)) / (2 * Math.PI);
      const expected = (-868e6 * 7 * ways) / lightspeed;
      expect(Math.abs(turns - expected - Math.round(turns - expected))).toBeLessThan(1e-9);
    }
  });
});

describe('a description', () => {
  it('has a default for everything', () => {
    const scene = completeScene();
    expect(scene).toMatchObject({ rangeLengthM: 10, autPort: 1, antennas: { aut: { kind: 'yagi5' } } });
  });

  const nonsense: [string, SceneDescription][] = [
    ['no range', { rangeLengthM: 0 }],
    ['not a number', { drift: { dbPerHour: Number.NaN } }],
    ['buried', { ground: { rangeAntennaM: -1, autM: 2, reflectionMagnitude: 1 } }],
    ['steeper than the range is long', { ground: { rangeAntennaM: 20, autM: 2, reflectionMagnitude: 1 } }],
    ['reflecting everything', { antennas: { aut: isotropic(0, 1) } }],
    ['a wall in the way', { walls: [{ side: 'left', distanceM: 0, reflectionDb: -3 }] }],
    ['an echo before its cause', { echoes: [{ extraPathM: -1, levelDb: -20 }] }],
    ['a line of no length', { antennas: { aut: { kind: 'line-source', lengthM: 0 } } }],
  ];
  it.each(nonsense)('is refused: %s', (_, description) => {
    expect(() => new Scene(description)).toThrow(SceneError);
  });
});
