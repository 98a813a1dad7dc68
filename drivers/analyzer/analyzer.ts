// What a network analyzer does for a run, in the trade's words and units. Nothing here knows of SCPI.
// Signs and shapes: frequencies in Hz, ascending; complex traces are interleaved Float64Array
// (re, im, re, im …) of length 2N at the calibrated plane, time factor exp(+jwt); powers in dBm.

export type SParameter = 'S11' | 'S21' | 'S12' | 'S22';

export interface AnalyzerIdentity {
  maker: string;
  model: string;
  serial: string;
  firmware: string;
}

export interface SweepSetup {
  startHz: number;
  stopHz: number;
  /** Points of the linear sweep, both ends included; at least 2 (1 where startHz = stopHz). */
  points: number;
  ifBandwidthHz: number;
  powerDbm: number;
  /** Sweeps averaged into one acquisition; 1 is no averaging. */
  averages: number;
  /** What is recorded in every sweep; `acquire` may read a subset. */
  parameters: readonly SParameter[];
}

/** What the instrument has confirmed after `prepare`. */
export interface PreparedSweep {
  /** N frequencies, as the instrument reports or its read-back implies. */
  frequenciesHz: Float64Array;
  ifBandwidthHz: number;
  powerDbm: number;
  averages: number;
  parameters: readonly SParameter[];
  /** Expected time of one whole acquisition, averages included, as the instrument tells it. */
  acquisitionMs: number;
}

/** When each point was measured: point i at firstMs + (lastMs − firstMs)·i/(N−1), relative to the sweep start. */
export interface TimeLaw {
  kind: 'linear';
  firstMs: number;
  lastMs: number;
}

export interface Acquisition {
  /** Clock.monotonicMs() when the sweep was started and when its end was known. */
  startMonotonicMs: number;
  stopMonotonicMs: number;
  timeLaw: TimeLaw;
  /** One complex trace of length 2N for each parameter read. */
  traces: ReadonlyMap<SParameter, Float64Array>;
}

export interface CalibrationState {
  correctionOn: boolean;
  /** Present only where the instrument tells. */
  interpolated?: boolean;
  date?: string;
}

export interface Analyzer {
  /** Opens the link if needed, brings question and answer into step, and asks who is there. */
  identify(signal?: AbortSignal): Promise<AnalyzerIdentity>;
  /**
   * Sets everything, reads everything back, and drains the error queue. Throws ANALYZER_SETTING_DIFFERS
   * when the instrument accepted another value than asked, ANALYZER_COMMAND_REFUSED when it refused one.
   */
  prepare(setup: SweepSetup, signal?: AbortSignal): Promise<PreparedSweep>;
  /**
   * One acquisition of the prepared sweep. `parameters` (a subset of the prepared ones; default all) says
   * which traces to read. Every block is checked before it is returned: length, finite, |S| < 100.
   * After a failure the session is back in step, or the thrown error says it is not.
   */
  acquire(parameters?: readonly SParameter[], signal?: AbortSignal): Promise<Acquisition>;
  /** Output power on or off, confirmed by read-back. */
  source(on: boolean, signal?: AbortSignal): Promise<void>;
  calibrationState(signal?: AbortSignal): Promise<CalibrationState>;
  /** Closes the connection, opens a new one, proves that answers pair with questions, prepares again. */
  recover(signal?: AbortSignal): Promise<void>;
  close(): Promise<void>;
}
