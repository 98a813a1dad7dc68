import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { parseQuantity, type QuantityKind, quantityPattern } from '../../../../daemon/files/quantity.ts';

const good: [QuantityKind, string, number][] = [
  ['frequency', '868 MHz', 868_000_000],
  ['frequency', '868.1 MHz', 868_100_000],
  ['frequency', '2.4GHz', 2_400_000_000],
  ['frequency', '10 kHz', 10_000],
  ['frequency', '1e3 Hz', 1000],
  ['frequency', '8.68E2 MHz', 868_000_000],
  ['power', '-10 dBm', -10],
  ['power', '+3 dBm', 3],
  ['gain', '2.15 dBi', 2.15],
  ['ratio', '.2 dB', 0.2],
  ['length', '6 m', 6],
  ['length', '34.5 cm', 0.345],
  ['length', '5. mm', 0.005],
  ['length', '2 km', 2000],
  ['duration', '250 ms', 250],
  ['duration', '2 s', 2000],
  ['duration', '500 us', 0.5],
  ['duration', '500 µs', 0.5],
  ['duration', '1.5 min', 90_000],
  ['duration', '8 h', 28_800_000],
  ['angle', '1 deg', 1],
  ['angle', '1°', 1],
  ['angle', '-0 deg', 0],
  ['angle', '0.05 deg', 0.05],
  ['rate', '20 deg/s', 20],
  ['rate', '20 °/s', 20],
  ['acceleration', '40 deg/s2', 40],
  ['acceleration', '40 deg/s²', 40],
  ['acceleration', '40 °/s^2', 40],
  ['scale', '8.889 units/deg', 8.889],
  ['power density', '0.2 mW/cm2', 2],
  ['power density', '4.34 W/m²', 4.34],
];

const bad: [QuantityKind, string, string | undefined][] = [
  ['frequency', '868', undefined],
  ['frequency', '', undefined],
  ['frequency', 'MHz', undefined],
  ['frequency', '868 m', undefined],
  ['frequency', '868 mHz', 'thousandth of a hertz'],
  ['frequency', '868 Mhz', 'write MHz'],
  ['frequency', '10 KHz', 'write kHz'],
  ['frequency', '868,5 MHz', 'not a comma'],
  ['frequency', '1,000 MHz', 'not a comma'],
  ['frequency', '1 000 MHz', 'without separators'],
  ['frequency', '1_000 MHz', 'without separators'],
  ['frequency', "1'000 MHz", 'without separators'],
  ['frequency', '1.2.3 MHz', undefined],
  ['frequency', '0x10 Hz', undefined],
  ['frequency', '1e999 Hz', 'too large'],
  ['frequency', '1e99999 Hz', undefined],
  ['frequency', '868 MHz 2', undefined],
  ['frequency', '--8 MHz', undefined],
  ['frequency', 'NaN', 'finite'],
  ['frequency', '.inf', 'finite'],
  ['power', '-inf dBm', 'finite'],
  ['power', '−10 dBm', 'plain -'],
  ['power', '0.1 mW', 'dBm'],
  ['power', '-10 dB', 'write dBm'],
  ['power', '-10 DBM', 'write dBm'],
  ['gain', '0 dBd', 'add 2.15 dB'],
  ['gain', '2 dB', 'over what'],
  ['ratio', '2 dBi', 'write dB'],
  ['length', '6 M', 'write m'],
  ['duration', '2 S', 'write s'],
  ['angle', '1 rad', 'deg'],
  ['angle', '1 constructor', undefined],
  ['rate', '3 rpm', '6 deg/s'],
  ['rate', '20 deg', undefined],
  ['power density', '28 V/m', 'plane wave'],
];

describe('quantities', () => {
  it.each(good)('%s %j is %d', (kind, text, value) => {
    expect(parseQuantity(text, kind)).toStrictEqual({ kind: 'value', value });
    expect(text).toMatch(new RegExp(quantityPattern(kind)));
  });

  it.each(bad)('%s %j is refused', (kind, text, advice) => {
    const outcome = parseQuantity(text, kind);
    expect(outcome.kind).toBe('refused');
    const given = outcome.kind === 'refused' ? outcome.advice : undefined;
    if (advice === undefined) expect(given).toBeUndefined();
    else expect(given).toContain(advice);
    if (text !== '1e999 Hz') expect(text).not.toMatch(new RegExp(quantityPattern(kind)));
  });

  it('shifts decimals exactly: any number of hertz written in MHz comes back', () => {
    fc.assert(
      fc.property(fc.integer({ min: 0, max: 2 ** 48 }), (hertz) => {
        const digits = String(hertz).padStart(7, '0');
        const text = `${digits.slice(0, -6)}.${digits.slice(-6)} MHz`;
        expect(parseQuantity(text, 'frequency')).toStrictEqual({ kind: 'value', value: hertz });
      }),
    );
  });

  it('reads what JavaScript prints, bit for bit', () => {
    const double = fc.double({ noNaN: true, noDefaultInfinity: true, min: -1e20, max: 1e20 });
    fc.assert(
      fc.property(double, (value) => {
        expect(parseQuantity(`${value} deg`, 'angle')).toStrictEqual({ kind: 'value', value: value + 0 });
      }),
    );
  });

  it('gives a finite number or a refusal for any text', () => {
    const pieces = fc.constantFrom(
      '1',
      '-',
      '+',
      '.',
      ',',
      'e',
      'E',
      '9',
      ' ',
      'MHz',
      'nan',
      '\n',
      '°',
      'k',
      '0x',
    );
    fc.assert(
      fc.property(fc.array(pieces, { maxLength: 8 }), (parts) => {
        const outcome = parseQuantity(parts.join(''), 'frequency');
        if (outcome.kind === 'value') expect(Number.isFinite(outcome.value)).toBe(true);
      }),
      { numRuns: 2000 },
    );
  });
});
