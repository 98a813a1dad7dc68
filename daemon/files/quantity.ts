// Numbers with units as people write them in range files and plans: `868 MHz`, `-10 dBm`, `20 deg/s`.
// A unit is always required, its case matters, and the decimal is shifted as text, so that 868.1 MHz is
// exactly 868100000 Hz. Knows nothing of files, lines or limits of single fields.

export type QuantityKind =
  | 'frequency'
  | 'power'
  | 'gain'
  | 'ratio'
  | 'length'
  | 'duration'
  | 'angle'
  | 'rate'
  | 'acceleration'
  | 'scale'
  | 'power density';

export type ParsedQuantity = { kind: 'value'; value: number } | { kind: 'refused'; advice?: string };

interface Unit {
  /** Spellings; the first is the one we advise. */
  symbols: readonly string[];
  /** The base unit times 10^power, times `factor` where the unit is no power of ten. */
  power: number;
  factor?: number;
}

interface Quantity {
  expectation: string;
  units: readonly Unit[];
  /** Advice for units that mean the same thing elsewhere but are not taken here. */
  strangers?: Readonly<Record<string, string>>;
}

function unit(power: number, ...symbols: string[]): Unit {
  return { symbols, power };
}

/** Values come out in Hz, dBm, dBi, dB, m, ms, degrees, degrees/s, degrees/s², controller units per degree and W/m². */
export const quantities: Readonly<Record<QuantityKind, Quantity>> = {
  frequency: {
    expectation: 'a frequency with unit such as 868 MHz',
    units: [unit(6, 'MHz'), unit(9, 'GHz'), unit(3, 'kHz'), unit(0, 'Hz')],
  },
  power: {
    expectation: 'a power with unit such as -10 dBm',
    units: [unit(0, 'dBm')],
    strangers: { mW: 'powers are written in dBm', W: 'powers are written in dBm', dB: 'write dBm' },
  },
  gain: {
    expectation: 'a gain with unit such as 2.15 dBi',
    units: [unit(0, 'dBi')],
    strangers: {
      dBd: 'gain over a half-wave dipole: add 2.15 dB and write dBi',
      dB: 'say over what: write dBi for gain over an isotropic antenna',
    },
  },
  ratio: {
    expectation: 'a level difference with unit such as 0.2 dB',
    units: [unit(0, 'dB')],
    strangers: { dBi: 'write dB', dBm: 'write dB' },
  },
  length: {
    expectation: 'a length with unit such as 6 m',
    units: [unit(0, 'm'), unit(-2, 'cm'), unit(-3, 'mm'), unit(3, 'km')],
  },
  duration: {
    expectation: 'a duration with unit such as 250 ms',
    units: [
      unit(0, 'ms'),
      unit(3, 's'),
      unit(-3, 'us', '\u00b5s', '\u03bcs'),
      { symbols: ['min'], power: 4, factor: 6 },
      { symbols: ['h'], power: 5, factor: 36 },
    ],
  },
  angle: {
    expectation: 'an angle with unit such as 1 deg',
    units: [unit(0, 'deg', '°')],
    strangers: { rad: 'angles are written in deg' },
  },
  rate: {
    expectation: 'a turning rate with unit such as 20 deg/s',
    units: [unit(0, 'deg/s', '°/s')],
    strangers: { rpm: 'one turn per minute is 6 deg/s' },
  },
  acceleration: {
    expectation: 'an angular acceleration with unit such as 40 deg/s2',
    units: [unit(0, 'deg/s2', 'deg/s²', 'deg/s^2', '°/s2', '°/s²', '°/s^2')],
  },
  scale: {
    expectation: 'controller units per degree such as 8.889 units/deg',
    units: [unit(0, 'units/deg', 'units/°')],
  },
  'power density': {
    expectation: 'a power density with unit such as 2 W/m2',
    units: [unit(0, 'W/m2', 'W/m²', 'W/m^2'), unit(1, 'mW/cm2', 'mW/cm²', 'mW/cm^2')],
    strangers: { 'V/m': 'give the power density of the plane wave: the square of the field over 377 ohm' },
  },
};

const numberThenRest = /^([+-]?)(\d+\.?\d*|\.\d+)(?:[eE]([+-]?\d{1,4}))?(?!\d)\s*(.*)$/s;

/** One written quantity to its base unit (see `quantities`), or refused, with advice where the slip is known. */
export function parseQuantity(text: string, kind: QuantityKind): ParsedQuantity {
  const match = numberThenRest.exec(text.trim());
  if (!match) return refused(adviceOnNumber(text.trim()));
  const [, sign = '', mantissa = '', exponent = '0', rest = ''] = match;
  const spoiled = adviceOnRest(rest);
  if (spoiled !== undefined) return refused(spoiled);
  const found = quantities[kind].units.find((candidate) => candidate.symbols.includes(rest));
  if (!found) return refused(adviceOnUnit(rest, kind));
  const value = Number(`${sign}${mantissa}e${Number(exponent) + found.power}`) * (found.factor ?? 1);
  if (!Number.isFinite(value)) return refused('the number is too large');
  // + 0 turns a written -0 into 0.
  return { kind: 'value', value: value + 0 };
}

/** The same grammar as a regular expression for the JSON Schema, so that editors underline slips early. */
export function quantityPattern(kind: QuantityKind): string {
  const symbols = quantities[kind].units.flatMap((one) => one.symbols);
  const escaped = symbols.map((symbol) => symbol.replace(/[\^.+*]/g, '\\$&'));
  return `^[+-]?(\\d+\\.?\\d*|\\.\\d+)([eE][+-]?\\d{1,4})?\\s*(${escaped.join('|')})$`;
}

function refused(advice: string | undefined): ParsedQuantity {
  return advice === undefined ? { kind: 'refused' } : { kind: 'refused', advice };
}

function adviceOnNumber(text: string): string | undefined {
  if (/^[+-]?\.?(nan|inf)/i.test(text)) return 'only finite numbers';
  if (/^[\u2010-\u2015\u2212]/.test(text)) return 'write the minus sign as a plain -';
  return undefined;
}

function adviceOnRest(rest: string): string | undefined {
  if (/^,\d/.test(rest)) return 'write the decimals after a point, not a comma';
  if (/^[\d_'\u00a0\u202f]/.test(rest)) return 'write the number without separators between its digits';
  return undefined;
}

function adviceOnUnit(written: string, kind: QuantityKind): string | undefined {
  const { units, strangers = {} } = quantities[kind];
  if (Object.hasOwn(strangers, written)) return strangers[written];
  const sameLetters = units
    .flatMap((candidate) => candidate.symbols)
    .find((symbol) => symbol.toLowerCase() === written.toLowerCase());
  if (sameLetters === undefined) return undefined;
  if (written === 'mHz') return 'mHz is a thousandth of a hertz; write MHz';
  return `upper and lower case matter in units; write ${sameLetters}`;
}
