// From an antenna's description to the antenna in its mount: which kind, and how it is turned there.
import {
  AnalyticAntenna,
  cardioidPattern,
  halfWavePattern,
  isotropicPattern,
  lineSourcePattern,
} from './analytic-antennas.ts';
import type { Antenna } from './antenna.ts';
import { type Complex, fromPolar } from './complex.ts';
import dipoleBand from './data/dipole-band.json' with { type: 'json' };
import yagi5Band from './data/yagi5-band.json' with { type: 'json' };
import { NecAntenna, type WireAntennaData } from './nec-antenna.ts';
import { after, azimuthTurn, elevationTurn, type Rotation } from './orientation.ts';
import type { AntennaDescription } from './scene-description.ts';

export interface MountedAntenna {
  antenna: Antenna;
  /** From the mount's frame to the antenna's own. */
  squint: Rotation;
  /** Amplitude factor of the antenna's heat loss. */
  lossFactor: number;
}

/** Directivity of the pure cardioid is 3 (closed form). */
const cardioidDbi = 10 * Math.log10(3);

export function mountAntenna(description: AntennaDescription): MountedAntenna {
  const { rotateAzimuthDeg = 0, rotateElevationDeg = 0, lossDb = 0 } = description;
  return {
    antenna: antennaOf(description),
    squint: after(elevationTurn(-rotateElevationDeg), azimuthTurn(-rotateAzimuthDeg)),
    lossFactor: 10 ** (-lossDb / 20),
  };
}

function antennaOf(description: AntennaDescription): Antenna {
  const name = description.name ?? description.kind;
  const crossRatio = crossRatioOf(description);
  if (description.kind === 'yagi5' || description.kind === 'dipole') {
    const data = description.kind === 'yagi5' ? yagi5Band : dipoleBand;
    return new NecAntenna(name, scaled(data, description.lengthScale ?? 1), crossRatio);
  }
  const { magnitude, phaseDeg } = description.reflection ?? { magnitude: 0, phaseDeg: 0 };
  const port = { reflection: fromPolar(magnitude, phaseDeg), crossRatio };
  switch (description.kind) {
    case 'half-wave-dipole':
      return new AnalyticAntenna(name, 'theta', port, halfWavePattern());
    case 'isotropic':
      return new AnalyticAntenna(name, 'matched', port, isotropicPattern(description.gainDbi ?? 0));
    case 'cardioid': {
      const { gainDbi = cardioidDbi, frontToBackDb = Number.POSITIVE_INFINITY } = description;
      return new AnalyticAntenna(name, 'matched', port, cardioidPattern(gainDbi, frontToBackDb));
    }
    case 'line-source': {
      const pattern = lineSourcePattern(description.lengthM, description.gainDbi, description.frontToBackDb);
      return new AnalyticAntenna(name, 'matched', port, pattern);
    }
  }
}

function crossRatioOf({ crossPolarDb, crossPolarPhaseDeg = 0 }: AntennaDescription): Complex {
  return crossPolarDb === undefined
    ? { re: 0, im: 0 }
    : fromPolar(10 ** (-crossPolarDb / 20), crossPolarPhaseDeg);
}

/** Longer wires do the same at lower frequencies. */
function scaled(data: WireAntennaData, lengthScale: number): WireAntennaData {
  if (lengthScale === 1) return data;
  const lower = (frequencyHz: number): number => frequencyHz / lengthScale;
  return {
    ...data,
    frequenciesHz: data.frequenciesHz.map(lower),
    impedance: { ...data.impedance, frequenciesHz: data.impedance.frequenciesHz.map(lower) },
  };
}
