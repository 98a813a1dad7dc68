// The numbered settings: which exist, what values they take, how they are printed. Kept in the controller's
// non-volatile store, so they survive restarts of the simulated device.
import { axisLetters } from './traits.ts';

interface SettingKind {
  number: number;
  factory: number;
  /** Decimals in the print-out; 0 for whole numbers. */
  decimals: number;
  minimum?: number;
  /** Error when the value is below the minimum, instead of the usual one for negative values. */
  belowMinimum?: number;
}

const whole = (number: number, factory: number): SettingKind => ({ number, factory, decimals: 0 });
const real = (number: number, factory: number): SettingKind => ({ number, factory, decimals: 3 });

const plainKinds: SettingKind[] = [
  { number: 0, factory: 10, decimals: 0, minimum: 3, belowMinimum: 6 },
  whole(1, 25),
  whole(2, 0),
  whole(3, 0),
  whole(4, 0),
  whole(5, 0),
  whole(6, 0),
  whole(10, 1),
  real(11, 0.01),
  real(12, 0.002),
  whole(13, 0),
  whole(20, 0),
  whole(21, 0),
  whole(22, 0),
  whole(23, 0),
  real(24, 25),
  real(25, 500),
  whole(26, 250),
  real(27, 1),
  whole(30, 1000),
  whole(31, 0),
  whole(32, 0),
];

/** The store of one controller. Per-axis settings sit at 100, 110, 120 and 130 plus the axis index. */
export class Settings {
  readonly #kinds = new Map<number, SettingKind>();
  readonly #values = new Map<number, number>();

  constructor(axisCount: number, extended: boolean, initial: Readonly<Record<number, number>>) {
    const kinds = [...plainKinds];
    if (extended) kinds.push(whole(37, 0), whole(40, 0), whole(376, 1), whole(481, 0));
    const perAxis: [base: number, factory: number][] = [
      [100, 250],
      [110, 500],
      [120, 10],
      [130, 200],
    ];
    for (const [base, factory] of perAxis) {
      for (let axis = 0; axis < axisCount; axis += 1) kinds.push(real(base + axis, factory));
    }
    kinds.sort((a, b) => a.number - b.number);
    for (const kind of kinds) {
      this.#kinds.set(kind.number, kind);
      this.#values.set(kind.number, initial[kind.number] ?? kind.factory);
    }
  }

  value(number: number): number {
    return this.#values.get(number) ?? 0;
  }

  /** One value per axis, such as all rates for base 110. */
  perAxis(base: 100 | 110 | 120 | 130, axisCount: number): number[] {
    return axisLetters.slice(0, axisCount).map((_, axis) => this.value(base + axis));
  }

  /** Stores a value; the error number when it is refused, else undefined. */
  store(number: number, value: number): number | undefined {
    const kind = this.#kinds.get(number);
    if (!kind) return 3;
    if (value < 0) return 4;
    if (kind.minimum !== undefined && value < kind.minimum) return kind.belowMinimum ?? 4;
    if (number === 20 && value !== 0 && this.value(22) === 0) return 10;
    this.#values.set(number, kind.decimals === 0 ? Math.trunc(value) : value);
    // Soft limits mean nothing without homing.
    if (number === 22 && value === 0) this.#values.set(20, 0);
    return undefined;
  }

  /** The print-out of one setting, or undefined when there is none of that number. */
  line(number: number): string | undefined {
    const kind = this.#kinds.get(number);
    return kind && `$${number}=${this.value(number).toFixed(kind.decimals)}`;
  }

  lines(): string[] {
    return [...this.#kinds.keys()].map((number) => this.line(number)!);
  }
}

/** A stage that turns in degrees: 80 steps per degree, 30°/s, 360°/s², motors always on. */
export const stageSettings: Readonly<Record<number, number>> = {
  1: 255,
  24: 300,
  25: 1200,
  ...Object.fromEntries(
    [0, 1, 2, 3].flatMap((axis) => [
      [100 + axis, 80],
      [110 + axis, 1800],
      [120 + axis, 360],
      [130 + axis, 370],
    ]),
  ),
};
