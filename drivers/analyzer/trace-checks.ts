// Whether a trace can be a measurement at all, pure. What a good sweep looks like within a run (outliers,
// interference) is judged by the run; here only what no passive antenna range can give.
import { DriverError, type ErrorFacts } from '../errors.ts';
import type { SParameter } from './analyzer.ts';

/** 40 dB of gain: no passive range has it, and wrongly ordered bytes nearly always do. */
const magnitudeMax = 100;
/** −400 dB, far below any receiver's floor: bytes in the wrong order, or nothing measured. */
const magnitudeMin = 1e-20;

/**
 * Throws ANALYZER_IMPLAUSIBLE_DATA unless every value is finite, every |S| below 100, not all of them are
 * zero (or next to it), and the trace differs from the one before: noise never repeats bit for bit, a
 * sweep that did not take place does. `trace` is interleaved (re, im).
 */
export function requirePlausible(
  parameter: SParameter,
  trace: Float64Array,
  previous: Float64Array | undefined,
): void {
  let largest = 0;
  for (let i = 0; i < trace.length; i += 2) {
    const re = trace[i]!;
    const im = trace[i + 1]!;
    const point = i / 2 + 1;
    if (!Number.isFinite(re) || !Number.isFinite(im)) {
      throw implausible(parameter, `point ${point} is no number (${re}, ${im})`, { point });
    }
    const magnitude = Math.hypot(re, im);
    if (magnitude >= magnitudeMax) {
      throw implausible(parameter, `point ${point} has a magnitude of ${magnitude.toPrecision(3)}`, {
        point,
        magnitude,
      });
    }
    largest = Math.max(largest, magnitude);
  }
  if (largest < magnitudeMin) {
    throw implausible(parameter, `no point is above ${magnitudeMin}`, { largest });
  }
  if (previous && isSame(trace, previous)) {
    throw implausible(parameter, 'the trace is bit for bit the one before: no sweep took place', {
      frozen: true,
    });
  }
}

function isSame(a: Float64Array, b: Float64Array): boolean {
  return a.length === b.length && a.every((value, index) => Object.is(value, b[index]));
}

function implausible(parameter: SParameter, because: string, facts: ErrorFacts): DriverError {
  return new DriverError('ANALYZER_IMPLAUSIBLE_DATA', `${parameter}: ${because}`, { parameter, ...facts });
}
