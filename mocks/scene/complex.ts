// A complex number as the scene hands it out, and decibels. Inner loops use interleaved arrays instead.

export interface Complex {
  re: number;
  im: number;
}

export const speedOfLightMPerS = 299_792_458;
export const degreesPerRadian = 180 / Math.PI;

export function fromPolar(magnitude: number, phaseDeg: number): Complex {
  const phase = phaseDeg / degreesPerRadian;
  return { re: magnitude * Math.cos(phase), im: magnitude * Math.sin(phase) };
}

export function multiply(a: Complex, b: Complex): Complex {
  return { re: a.re * b.re - a.im * b.im, im: a.re * b.im + a.im * b.re };
}

export function squaredMagnitude(z: Complex): number {
  return z.re * z.re + z.im * z.im;
}
