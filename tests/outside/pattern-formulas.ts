// Published pattern formulas, written here from the literature and from nothing of the daemon, and cuts
// sampled from them. Angles inside the formulas are radians; amplitudes are relative fields.
import { type Cut, cutFromSamples } from '../../daemon/pattern/cut.ts';

export type Field = (angleRad: number) => number;

/** A cut of a field over degrees; −180 to 180 becomes a full turn. Twenty logs of the magnitude, zero at −400. */
export function sampledCut(field: Field, fromDeg: number, toDeg: number, stepDeg: number): Cut {
  const count = Math.round((toDeg - fromDeg) / stepDeg) + 1;
  const anglesDeg = Float64Array.from({ length: count }, (_, k) => fromDeg + k * stepDeg);
  const levelDb = anglesDeg.map((deg) =>
    Math.max(-400, 20 * Math.log10(Math.abs(field((deg * Math.PI) / 180)))),
  );
  return cutFromSamples({ anglesDeg, levelDb }).cut;
}

/** Thin dipole of a length in wavelengths with sinusoidal current; angle from the wire. Balanis, ch. 4. */
export const dipole =
  (length: number): Field =>
  (t) =>
    Math.abs(Math.sin(t)) < 1e-9
      ? 0
      : (Math.cos(Math.PI * length * Math.cos(t)) - Math.cos(Math.PI * length)) / Math.sin(t);

/** Cardioid: (1 + cos t)/2. */
export const cardioid: Field = (t) => (1 + Math.cos(t)) / 2;

/** Power cos^q in front, nothing behind. Balanis, ch. 2. */
export const cosPower =
  (q: number): Field =>
  (t) =>
    Math.cos(t) > 0 ? Math.cos(t) ** (q / 2) : 0;

/** Power |sin|^q of the angle from the axis. */
export const sinPower =
  (q: number): Field =>
  (t) =>
    Math.abs(Math.sin(t)) ** (q / 2);

/** Field of a line source against x = (L/λ) sin t, by its taper. Balanis, Table 7.1. */
export const lineSources: Record<string, (x: number) => number> = {
  uniform: (x) => sinc(Math.PI * x),
  triangular: (x) => sinc((Math.PI * x) / 2) ** 2,
  cosine: (x) => (Math.abs(Math.abs(x) - 0.5) < 1e-9 ? Math.PI / 4 : Math.cos(Math.PI * x) / (1 - 4 * x * x)),
  'cosine squared': (x) =>
    Math.abs(Math.abs(x) - 1) < 1e-9
      ? 0.5
      : Math.sin(Math.PI * x) / (Math.PI * x || 1e-300) / (1 - x * x) || 1,
};

/** Uniform circular aperture against x = (D/λ) sin t: 2 J1(πx)/(πx). */
export const circularAperture = (x: number): number => {
  const v = Math.PI * x;
  return Math.abs(v) < 1e-9 ? 1 : (2 * besselJ1(v)) / v;
};

/** Array of N isotropic elements, spacing in wavelengths, phase step in radians; angle from the array's axis. */
export const uniformArray =
  (n: number, spacing: number, phaseStep: number): Field =>
  (t) => {
    const psi = 2 * Math.PI * spacing * Math.cos(t) + phaseStep;
    const half = Math.sin(psi / 2);
    return Math.abs(half) < 1e-12 ? 1 : Math.sin((n * psi) / 2) / (n * half);
  };

/** Dolph–Chebyshev array of N elements half a wavelength apart: T(N−1)(z0 cos(ψ/2))/R0; angle off broadside. */
export const chebyshevArray =
  (n: number, ratio: number): Field =>
  (t) => {
    const z0 = Math.cosh(Math.acosh(ratio) / (n - 1));
    return chebyshev(n - 1, z0 * Math.cos((Math.PI * Math.sin(t)) / 2)) / ratio;
  };

/** Taylor line source (Chebyshev error) against u = (L/λ) cos of the angle from the axis. Balanis, sec. 7.6. */
export const taylorLineSource = (ratio: number, nBar: number) => {
  const a = Math.acosh(ratio) / Math.PI;
  const sigma = nBar / Math.hypot(a, nBar - 0.5);
  return (u: number): number => {
    let field = sinc(Math.PI * u);
    for (let n = 1; n < nBar; n += 1) {
      const zero = sigma * Math.hypot(a, n - 0.5);
      field *= (1 - (u / zero) ** 2) / (1 - (u / n) ** 2);
    }
    return field;
  };
};

function sinc(v: number): number {
  return Math.abs(v) < 1e-12 ? 1 : Math.sin(v) / v;
}

function chebyshev(order: number, z: number): number {
  if (Math.abs(z) <= 1) return Math.cos(order * Math.acos(z));
  return Math.sign(z) ** order * Math.cosh(order * Math.acosh(Math.abs(z)));
}

/** Bessel's integral (1/π)∫cos(τ − v sin τ)dτ; the trapezoid converges faster than any power of the step. */
function besselJ1(v: number): number {
  const steps = 64;
  let sum = 0;
  for (let k = 0; k < steps; k += 1) {
    const tau = (2 * Math.PI * k) / steps;
    sum += Math.cos(tau - v * Math.sin(tau));
  }
  return sum / steps;
}
