// Texts and blocks of a SCPI instrument to values, pure. Knows the forms that instruments answer with,
// not what was asked: pairing answers with questions is the session's part, judging traces that of
// trace-checks.ts.
import { DriverError } from '../errors.ts';
import type { AnalyzerIdentity } from './analyzer.ts';

/** SCPI-1999: 9.9E37 stands for infinity or overflow, 9.91E37 for not a number. */
const noDataMagnitude = 9.9e37;
const decimal = /^[+-]?(\d+(\.\d*)?|\.\d+)([eE]\s?[+-]?\d+)?$/;
const notANumber = /^[+-]?(nan|1\.#(qnan|snan|ind)\d*)$/i;
const infinite = /^([+-]?)(n?)(inf(inity)?|1\.#inf\d*)$/i;

/**
 * One decimal answer (NR1, NR2 or NR3). "No data" comes out as NaN or ±Infinity, whether the instrument
 * says it in words or as 9.9E37; whether that is acceptable the caller decides.
 * Throws ANALYZER_BAD_ANSWER for anything else.
 */
export function decodeNumber(text: string): number {
  const trimmed = text.trim();
  if (decimal.test(trimmed)) return withoutOverflow(Number(trimmed.replace(/\s/g, '')));
  if (notANumber.test(trimmed)) return Number.NaN;
  const limit = infinite.exec(trimmed);
  if (limit) return (limit[1] === '-') !== (limit[2] !== '') ? -Infinity : Infinity;
  throw new DriverError('ANALYZER_BAD_ANSWER', `'${excerpt(text)}' is not a number`, {
    answer: excerpt(text),
  });
}

function withoutOverflow(value: number): number {
  if (Math.abs(value) < noDataMagnitude) return value;
  if (Math.abs(value - 9.91e37) < 1e33) return Number.NaN;
  return value > 0 ? Infinity : -Infinity;
}

/** Like decodeNumber, for settings: "no data" is no setting. Throws ANALYZER_BAD_ANSWER. */
export function decodeSetting(text: string): number {
  const value = decodeNumber(text);
  if (Number.isFinite(value)) return value;
  throw new DriverError('ANALYZER_BAD_ANSWER', `'${excerpt(text)}' says that there is no value`, {
    answer: excerpt(text),
  });
}

/** Like decodeNumber; undefined where the instrument says that there is no value. */
export function decodeStated(text: string): number | undefined {
  const value = decodeNumber(text);
  return Number.isFinite(value) ? value : undefined;
}

/**
 * A list with commas, white space around them allowed; without any comma, with semicolons or white space.
 * Throws ANALYZER_BAD_ANSWER.
 */
export function decodeNumberList(text: string): Float64Array {
  const parts = text.includes(',') ? text.split(',') : text.trim().split(/\s*;\s*|\s+/);
  return Float64Array.from(parts, decodeNumber);
}

/** `1`, `0`, `ON`, `OFF` and their like. Throws ANALYZER_BAD_ANSWER. */
export function decodeBoolean(text: string): boolean {
  const word = decodeWord(text);
  if (word === 'ON') return true;
  if (word === 'OFF') return false;
  const value = decodeSetting(text);
  if (value === 0 || value === 1) return value === 1;
  throw new DriverError('ANALYZER_BAD_ANSWER', `'${excerpt(text)}' is neither on nor off`, {
    answer: excerpt(text),
  });
}

/** Like decodeBoolean, and `HOLD`, `SING…` for off, `CONT…` for on. Throws ANALYZER_BAD_ANSWER. */
export function decodeContinuous(text: string): boolean {
  const word = decodeWord(text);
  if (word === 'HOLD' || word.startsWith('SING')) return false;
  return word.startsWith('CONT') || decodeBoolean(text);
}

/** A word or string answer in one form: upper case, without quotes, without white space. */
export function decodeWord(text: string): string {
  return text.replace(/["'\s]/g, '').toUpperCase();
}

/**
 * The payload of a definite block as numbers of `bytesEach` (4 or 8) bytes.
 * Throws ANALYZER_BAD_BLOCK when the length does not divide.
 */
export function decodeBlock(
  data: Uint8Array,
  bytesEach: 4 | 8,
  byteOrder: 'normal' | 'swapped',
): Float64Array {
  if (data.length % bytesEach !== 0) {
    throw new DriverError(
      'ANALYZER_BAD_BLOCK',
      `a block of ${data.length} bytes holds no whole number of ${bytesEach}-byte values: the format was changed`,
      { bytes: data.length, bytesEach, firstBytesHex: hexOf(data) },
    );
  }
  const view = new DataView(data.buffer, data.byteOffset, data.byteLength);
  const little = byteOrder === 'swapped';
  const values = new Float64Array(data.length / bytesEach);
  for (let i = 0; i < values.length; i += 1) {
    const at = i * bytesEach;
    values[i] = bytesEach === 8 ? view.getFloat64(at, little) : view.getFloat32(at, little);
  }
  return values;
}

/**
 * Whether `header` can stand in front of the answer to `question`, as instruments with headers switched on
 * print it: `:SENSE1:FREQUENCY:START` or `FREQ:STAR` for `:SENS1:FREQ:STAR?`. The last node decides.
 */
export function isHeaderOf(question: string, header: string): boolean {
  if (!/^[:*]?[A-Za-z][\w:]*$/.test(header)) return false;
  const [asked = ''] = question.split('?');
  return lastNode(header).startsWith(lastNode(asked));
}

function lastNode(header: string): string {
  return (header.split(/[:*]/).at(-1) ?? '').replace(/\d+$/, '').toUpperCase();
}

/** One entry of the instrument's error queue; code 0 means that the queue is empty. */
export interface ScpiErrorEntry {
  code: number;
  text: string;
}

/** `-113,"Undefined header;FREQU"`, `+0,"No error"`, `0`. Throws ANALYZER_BAD_ANSWER. */
export function decodeErrorEntry(text: string): ScpiErrorEntry {
  const parts = /^\s*([+-]?\d+)\s*(?:,\s*(.*?))?\s*$/s.exec(text);
  if (!parts) {
    throw new DriverError('ANALYZER_BAD_ANSWER', `'${excerpt(text)}' is no entry of an error queue`, {
      answer: excerpt(text),
    });
  }
  // Adding 0 turns "-0" into a plain zero.
  return { code: Number(parts[1]) + 0, text: unquoted(parts[2] ?? '') };
}

function unquoted(text: string): string {
  const quote = text[0];
  if ((quote !== '"' && quote !== "'") || text.length < 2 || !text.endsWith(quote)) return text;
  return text.slice(1, -1).replaceAll(quote + quote, quote);
}

/** Whether a line has the shape of an `*IDN?` answer: at least three commas. */
export function looksLikeIdentity(text: string): boolean {
  return text.split(',').length >= 4 && !/^\s*[+-]?\d+\s*,\s*"/.test(text);
}

/** The four fields of `*IDN?`; whatever follows the third comma is firmware. Throws ANALYZER_BAD_ANSWER. */
export function decodeIdentity(text: string): AnalyzerIdentity {
  if (!looksLikeIdentity(text)) {
    throw new DriverError('ANALYZER_BAD_ANSWER', `'${excerpt(text)}' is no identity`, {
      answer: excerpt(text),
    });
  }
  const [maker = '', model = '', serial = '', ...firmware] = unquoted(text.trim()).split(',');
  return {
    maker: maker.trim(),
    model: model.trim(),
    serial: serial.trim(),
    firmware: firmware.join(',').trim(),
  };
}

/** The first bytes of something unreadable, for facts and log. */
export function hexOf(bytes: Uint8Array, count = 32): string {
  return Array.from(bytes.subarray(0, count), (byte) => byte.toString(16).padStart(2, '0')).join(' ');
}

/** The beginning of a text on one line, control characters shown as codes. */
export function excerpt(text: string, length = 80): string {
  const visible = text.replace(
    /[\x00-\x1f\x7f]/g,
    (c) => `\\x${c.charCodeAt(0).toString(16).padStart(2, '0')}`,
  );
  return visible.length > length ? `${visible.slice(0, length)}…` : visible;
}
