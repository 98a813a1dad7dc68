// One figure of a pattern as it leaves the mathematics: a value, a bound, or the reason why there is none.
// Every number in it is finite. Uncertainty is added by other parts; it is not known here.
import { finite } from './pattern-error.ts';

/** A figure that was read. `note` says in words what the reader must know about it. */
export interface FigureValue {
  kind: 'value';
  value: number;
  note?: string;
}

/**
 * A figure of which one side alone is known, in the unit of its key.
 * `upper`: the true figure is at most `value`; `lower`: it is at least `value`.
 */
export interface FigureBound {
  kind: 'bound';
  bound: 'upper' | 'lower';
  value: number;
  note?: string;
}

/** No figure exists, for the reason given in words an operator understands. */
export interface FigureAbsent {
  kind: 'absent';
  because: string;
}

export type Figure = FigureValue | FigureBound | FigureAbsent;

/**
 * A figure with a value.
 *
 * @param value in the unit of the figure's key; finite, else PatternError
 * @param note what the reader must know about it, where there is something
 */
export function valueFigure(value: number, note?: string): FigureValue {
  const figure = { kind: 'value', value: withoutNegativeZero(value) } as const;
  return note === undefined ? figure : { ...figure, note };
}

/**
 * A figure known from one side.
 *
 * @param bound which side `value` limits
 * @param value in the unit of the figure's key; finite, else PatternError
 * @param note what the reader must know about it, where there is something
 */
export function boundFigure(bound: 'upper' | 'lower', value: number, note?: string): FigureBound {
  const figure = { kind: 'bound', bound, value: withoutNegativeZero(value) } as const;
  return note === undefined ? figure : { ...figure, note };
}

/** No figure, with the reason. */
export function absentFigure(because: string): FigureAbsent {
  return { kind: 'absent', because };
}

function withoutNegativeZero(value: number): number {
  return finite('a figure', value) + 0;
}
