// Chance for the simulated bench: repeatable from one seed, and one named stream per consumer, so that a
// consumer that draws more or less does not shift the luck of the others. Not for secrets.

/** One sequence of random numbers; the same seed and name give the same sequence for ever. */
export class RandomStream {
  #a: number;
  #b: number;
  #c: number;
  #counter = 1;
  #spareNormal: number | undefined;

  constructor(words: readonly [number, number, number]) {
    [this.#a, this.#b, this.#c] = words;
    // The first outputs still show the seed; the generator's author lets a dozen pass.
    for (let i = 0; i < 12; i++) this.uint32();
  }

  /**
   * An integer from 0 to 2³² − 1.
   * Method: the "small fast counting" generator with 32-bit words, C. Doty-Humphrey, PractRand (public domain).
   */
  uint32(): number {
    const out = (this.#a + this.#b + this.#counter) | 0;
    this.#counter = (this.#counter + 1) | 0;
    this.#a = this.#b ^ (this.#b >>> 9);
    this.#b = (this.#c + (this.#c << 3)) | 0;
    this.#c = (((this.#c << 21) | (this.#c >>> 11)) + out) | 0;
    return out >>> 0;
  }

  /** A number in [low, high), 53 bits fine; [0, 1) without arguments. */
  uniform(low = 0, high = 1): number {
    const high26 = this.uint32() >>> 6;
    const low27 = this.uint32() >>> 5;
    return low + (high - low) * ((high26 * 0x8000000 + low27) / 0x20000000000000);
  }

  /** A normally distributed number (Box and Muller, 1958: two from two uniforms). */
  normal(mean = 0, standardDeviation = 1): number {
    const spare = this.#spareNormal;
    if (spare !== undefined) {
      this.#spareNormal = undefined;
      return mean + standardDeviation * spare;
    }
    const radius = Math.sqrt(-2 * Math.log(1 - this.uniform()));
    const angle = 2 * Math.PI * this.uniform();
    this.#spareNormal = radius * Math.sin(angle);
    return mean + standardDeviation * radius * Math.cos(angle);
  }

  /** An integer from 0 to count − 1, each equally likely to within 2⁻⁵³·count. */
  integer(count: number): number {
    return Math.floor(this.uniform() * count);
  }

  /** True with the given probability (0 never, 1 always). */
  chance(probability: number): boolean {
    return this.uniform() < probability;
  }
}

/** The stream of one consumer, such as `stream(seed, 'analyzer-noise')`. */
export function stream(seed: number | string, name: string): RandomStream {
  const text = `${typeof seed}:${seed}/${name}`;
  return new RandomStream([hash(text, 0x9e3779b9), hash(text, 0x85ebca6b), hash(text, 0xc2b2ae35)]);
}

/** FNV-1a over the code units (Fowler, Noll, Vo), then an avalanche so that near texts lie far apart. */
function hash(text: string, salt: number): number {
  let h = 0x811c9dc5 ^ salt;
  for (let i = 0; i < text.length; i++) {
    h = Math.imul(h ^ (text.charCodeAt(i) & 0xff), 0x01000193);
    h = Math.imul(h ^ (text.charCodeAt(i) >>> 8), 0x01000193);
  }
  h = Math.imul(h ^ (h >>> 16), 0x7feb352d);
  h = Math.imul(h ^ (h >>> 15), 0x846ca68b);
  return h ^ (h >>> 16);
}
