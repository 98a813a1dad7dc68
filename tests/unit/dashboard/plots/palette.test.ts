// Curves and texts can be told from the ground in both schemes: WCAG 2.1, 1.4.11 (3 : 1 for what is drawn)
// and 1.4.3 (4.5 : 1 for text), relative luminance as defined there.
import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import {
  axisNumber,
  cutStyle,
  cutStyles,
  darkColours,
  lightColours,
} from '../../../../dashboard/plots/palette.ts';

const style = readFileSync(new URL('../../../../dashboard/src/page.css', import.meta.url), 'utf8');
const grounds = [...style.matchAll(/--ground: (#[0-9a-f]{6})/g)].map(([, colour]) => colour!);

function luminance(colour: string): number {
  const [red, green, blue] = [1, 3, 5].map((at) => {
    const value = Number.parseInt(colour.slice(at, at + 2), 16) / 255;
    return value <= 0.03928 ? value / 12.92 : ((value + 0.055) / 1.055) ** 2.4;
  });
  return 0.2126 * red! + 0.7152 * green! + 0.0722 * blue!;
}

function contrast(a: string, b: string): number {
  const [low, high] = [luminance(a), luminance(b)].sort((x, y) => x - y);
  return (high! + 0.05) / (low! + 0.05);
}

describe('the palette', () => {
  it('stands out of the ground, light and dark', () => {
    expect(grounds).toHaveLength(2);
    expect(contrast('#000000', '#ffffff')).toBeCloseTo(21, 10);
    for (const ground of grounds) {
      for (const { color } of cutStyles) expect(contrast(color, ground), color).toBeGreaterThanOrEqual(3);
    }
    expect(contrast(lightColours.text, grounds[0]!)).toBeGreaterThanOrEqual(4.5);
    expect(contrast(darkColours.text, grounds[1]!)).toBeGreaterThanOrEqual(4.5);
  });

  it('tells curves apart without colour, and begins again after the last', () => {
    expect(new Set(cutStyles.map(({ type }) => String(type))).size).toBe(cutStyles.length);
    expect(cutStyle(cutStyles.length + 1)).toEqual(cutStyle(1));
  });

  it('prints a true minus sign', () => {
    expect([-30, 0, 868.5].map(axisNumber)).toEqual(['−30', '0', '868.5']);
  });
});
