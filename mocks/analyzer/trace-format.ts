// Numbers as the instrument sends them: text, or definite-length blocks in either byte order.
export type DataFormat = 'ascii' | 'real32' | 'real64';

/** What stands for "not a number" in text (SCPI-1999). */
const notANumber = 9.91e37;
const infinity = 9.9e37;

export function formatNumbers(
  values: Float64Array,
  format: DataFormat,
  swapped: boolean,
): string | Uint8Array {
  return format === 'ascii' ? asciiList(values) : block(values, format === 'real32' ? 4 : 8, swapped);
}

function asciiList(values: Float64Array): string {
  return Array.from(values, exponential).join(',');
}

/** Sign, eleven decimals, two digits of exponent: `+2.44186263453E-02`. */
function exponential(value: number): string {
  const sendable = Number.isNaN(value) ? notANumber : Math.max(-infinity, Math.min(infinity, value));
  const [mantissa, exponent] = sendable.toExponential(11).split('e');
  const sign = mantissa!.startsWith('-') ? '' : '+';
  const power = Number(exponent);
  return `${sign}${mantissa}E${power < 0 ? '-' : '+'}${String(Math.abs(power)).padStart(2, '0')}`;
}

/** `#`, the count of length digits, the length in bytes, the data. */
function block(values: Float64Array, size: 4 | 8, swapped: boolean): Uint8Array {
  const length = String(values.length * size);
  const head = `#${length.length}${length}`;
  const bytes = new Uint8Array(head.length + values.length * size);
  for (let i = 0; i < head.length; i++) bytes[i] = head.charCodeAt(i);
  const view = new DataView(bytes.buffer, head.length);
  values.forEach((value, i) => {
    if (size === 4) view.setFloat32(i * 4, value, swapped);
    else view.setFloat64(i * 8, value, swapped);
  });
  return bytes;
}

/** Plain numbers in answers to queries: integers as such, others as short as nine digits allow. */
export function plain(value: number): string {
  return Number.isInteger(value) ? String(value) : String(Number(value.toPrecision(9)));
}
