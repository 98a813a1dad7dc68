import { describe, expect, it } from 'vitest';
import { RandomStream, stream } from '../../../mocks/random.ts';

function draw(count: number, next: () => number): number[] {
  return Array.from({ length: count }, next);
}

function mean(values: readonly number[]): number {
  return values.reduce((sum, value) => sum + value, 0) / values.length;
}

// The recipe of the generator, PractRand's sfc32, written out anew in exact integers.
function* recipe(a: bigint, b: bigint, c: bigint): Generator<number> {
  const word = (x: bigint): bigint => BigInt.asUintN(32, x);
  for (let counter = 1n; ; counter++) {
    const out = word(a + b + counter);
    a = b ^ (b >> 9n);
    b = word(c + (c << 3n));
    c = word(word((c << 21n) | (c >> 11n)) + out);
    yield Number(out);
  }
}

describe('RandomStream', () => {
  it('follows the published recipe after its first twelve outputs', () => {
    const seeds: [number, number, number] = [0x12345678, 0x9abcdef0, 0xfedcba98];
    const random = new RandomStream(seeds);
    const expected = recipe(BigInt(seeds[0]), BigInt(seeds[1]), BigInt(seeds[2]));
    for (let i = 0; i < 12; i++) expected.next();
    for (let i = 0; i < 500; i++) expect(random.uint32()).toBe(expected.next().value);
  });
});

describe('stream', () => {
  it('repeats itself for the same seed and name', () => {
    const first = stream(7, 'analyzer-noise');
    const again = stream(7, 'analyzer-noise');
    expect(draw(1000, () => first.uniform())).toEqual(draw(1000, () => again.uniform()));
    expect(draw(1001, () => first.normal())).toEqual(draw(1001, () => again.normal()));
  });

  it('differs by seed, by name and by the kind of seed', () => {
    const firsts = [
      stream(7, 'analyzer-noise'),
      stream(8, 'analyzer-noise'),
      stream(7, 'drift'),
      stream('7', 'analyzer-noise'),
      stream(-7, 'analyzer-noise'),
    ].map((one) => one.uint32());
    expect(new Set(firsts).size).toBe(firsts.length);
  });

  it('does not depend on how much other streams have drawn', () => {
    const alone = stream(1, 'a');
    const expected = draw(5, () => alone.uint32());
    const mine = stream(1, 'a');
    const other = stream(1, 'b');
    const got = draw(5, () => {
      other.normal();
      return mine.uint32();
    });
    expect(got).toEqual(expected);
  });

  // Limits below are five standard errors of the statistic for the number of draws: about one seed in a
  // million would fail by luck, and the seed is fixed.
  it('is uniform: mean, variance and every hundredth filled evenly', () => {
    const random = stream(20, 'uniform');
    const values = draw(100_000, () => random.uniform());
    expect(Math.abs(mean(values) - 0.5)).toBeLessThan(5 * Math.sqrt(1 / 12 / values.length));
    const bins = new Array<number>(100).fill(0);
    for (const value of values) bins[Math.floor(value * 100)]! += 1;
    const chiSquare = bins.reduce((sum, count) => sum + (count - 1000) ** 2 / 1000, 0);
    // 99 degrees of freedom: mean 99, standard deviation √198 = 14.07.
    expect(Math.abs(chiSquare - 99)).toBeLessThan(5 * 14.07);
  });

  it('is normal: mean, variance, fourth moment and the share beyond two sigma', () => {
    const random = stream(21, 'normal');
    const values = draw(200_000, () => random.normal());
    const n = values.length;
    expect(Math.abs(mean(values))).toBeLessThan(5 / Math.sqrt(n));
    expect(Math.abs(mean(values.map((v) => v * v)) - 1)).toBeLessThan(5 * Math.sqrt(2 / n));
    expect(Math.abs(mean(values.map((v) => v ** 4)) - 3)).toBeLessThan(5 * Math.sqrt(96 / n));
    // P(|x| > 2) = erfc(√2) = 0.045500 (any table of the normal distribution).
    const beyond = values.filter((v) => Math.abs(v) > 2).length / n;
    expect(Math.abs(beyond - 0.0455)).toBeLessThan(5 * Math.sqrt((0.0455 * 0.9545) / n));
  });

  it('shows no correlation between neighbours, nor between two streams of one seed', () => {
    const a = stream(22, 'one');
    const b = stream(22, 'two');
    const first = draw(50_000, () => a.normal());
    const second = draw(50_000, () => b.normal());
    const limit = 5 / Math.sqrt(first.length);
    expect(Math.abs(mean(first.slice(1).map((v, i) => v * first[i]!)))).toBeLessThan(limit);
    expect(Math.abs(mean(first.map((v, i) => v * second[i]!)))).toBeLessThan(limit);
  });

  it('respects bounds, integers and chances', () => {
    const random = stream(23, 'bounds');
    const values = draw(10_000, () => random.uniform(-3, 5));
    expect(Math.min(...values)).toBeGreaterThanOrEqual(-3);
    expect(Math.max(...values)).toBeLessThan(5);
    expect(new Set(draw(1000, () => random.integer(6)))).toEqual(new Set([0, 1, 2, 3, 4, 5]));
    expect(draw(100, () => Number(random.chance(0))).every((hit) => hit === 0)).toBe(true);
    expect(draw(100, () => Number(random.chance(1))).every((hit) => hit === 1)).toBe(true);
  });
});
