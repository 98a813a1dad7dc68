// What the instrument asks of the world it is connected to: one pass over its grid at a time, driven from
// one port. The instrument knows nothing of antennas; the world is handed in.

export type SParameterName = 'S11' | 'S21' | 'S12' | 'S22';

export interface SweepPass {
  /** Those of the wanted parameters that this port drives. */
  parameters: readonly SParameterName[];
  drivenPort: 1 | 2;
  /** The same array as long as the grid is the same. */
  frequenciesHz: Float64Array;
  /** Clock.monotonicMs() at which point i was measured. */
  pointMs: (index: number) => number;
  ifBandwidthHz: number;
  /** Averages taken at each point within this pass. */
  averages: number;
  powerDbm: number;
  sourceOn: boolean;
  corrected: boolean;
}

/** Called when the pass is over: it must answer for moments that have passed. Traces are (re, im, …), 2N long. */
export type Measure = (pass: SweepPass) => Map<SParameterName, Float64Array>;
