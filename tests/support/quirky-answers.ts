// How the quirky instrument puts what it knows into bytes. Pure; formats by rules of this file alone.

export type NumberForm = 'plain' | 'signed' | 'lower' | 'long';

/** `1000000000`, `+1.00000000000E+09`, `1e9`, `1.000000000000E9`: four ways to print one value. */
export function formNumber(value: number, form: NumberForm): string {
  if (form === 'plain') return String(value);
  if (form === 'lower') return value.toExponential().replace('+', '');
  const [mantissa = '0', exponent = '0'] = value.toExponential(12).split('e');
  if (form === 'long') return `${mantissa}E${Number(exponent)}`;
  const power = Number(exponent);
  const sign = value < 0 ? '' : '+';
  return `${sign}${mantissa}E${power < 0 ? '-' : '+'}${String(Math.abs(power)).padStart(2, '0')}`;
}

export type ErrorForm = 'quoted' | 'bare' | 'number' | 'signed';
export type FormatWord = 'both' | 'word' | 'signed' | 'glued';

export const answerForms = {
  error(code: number, text: string, form: ErrorForm): string {
    if (form === 'number') return code === 0 ? '0' : `${code}`;
    const sign = form === 'signed' && code >= 0 ? '+' : '';
    return `${sign}${code},${form === 'bare' ? text : `"${text}"`}`;
  },
  /** `set` is what was sent, such as `REAL,64`. */
  format(set: string, form: FormatWord): string {
    const [word = '', bits] = set.split(',');
    if (bits === undefined) return word;
    return { both: set, word, signed: `${word},+${bits}`, glued: `${word}${bits}` }[form];
  },
};

/** A definite block; `digits`: how many stand for its length, as few as do when it is 0. */
export function blockOf(
  values: readonly number[],
  bytesEach: 4 | 8,
  swapped: boolean,
  digits: number,
): Uint8Array {
  const data = Buffer.alloc(values.length * bytesEach);
  values.forEach((value, index) => {
    const at = index * bytesEach;
    if (bytesEach === 8) swapped ? data.writeDoubleLE(value, at) : data.writeDoubleBE(value, at);
    else swapped ? data.writeFloatLE(value, at) : data.writeFloatBE(value, at);
  });
  const length = String(data.length).padStart(digits, '0');
  return Buffer.concat([Buffer.from(`#${length.length}${length}`), data]);
}
