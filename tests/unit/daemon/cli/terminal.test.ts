import { describe, expect, it } from 'vitest';
import {
  printable,
  renderDuration,
  renderMegahertz,
  renderNumber,
  renderTable,
} from '../../../../daemon/cli/terminal.ts';

describe('numbers', () => {
  it.each([
    [-0.001, 2, '0.00'],
    [-12.345, 1, '−12.3'],
    [0.005, 1, '0.0'],
    [61.294, 2, '61.29'],
  ])('%f with %i digits is %s', (value, digits, text) => {
    expect(renderNumber(value, digits)).toBe(text);
  });

  it.each([
    [868e6, '868'],
    [868.5e6, '868.5'],
    [868_125_000, '868.125'],
    [10e9, '10000'],
    [100e6, '100'],
  ])('%f Hz is %s MHz', (hz, text) => {
    expect(renderMegahertz(hz)).toBe(text);
  });
});

describe('durations', () => {
  it.each([
    [0, '0 s'],
    [200, '0.2 s'],
    [12_400, '12 s'],
    [200_000, '3 min 20 s'],
    [7_500_000, '2 h 05 min'],
    [-5, '0 s'],
  ])('%d ms is %s', (ms, text) => {
    expect(renderDuration(ms)).toBe(text);
  });
});

describe('tables', () => {
  it('put numbers to the right and words to the left, without trailing blanks', () => {
    const text = renderTable(
      ['run', 'antenna'],
      [
        ['1', 'yagi'],
        ['12', 'a longer one'],
      ],
    );
    expect(text).toBe('run  antenna\n  1  yagi\n 12  a longer one\n');
  });
});

it('lets no control character of a name reach the terminal', () => {
  expect(printable('a\u001b[31mb\r\n\u0007c\u009b')).toBe('a?[31mb???c?');
});
