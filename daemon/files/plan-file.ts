// What to measure, as checked values with units. Loading and its errors are beside this file.

export interface PlanCut {
  name: string;
  /** Swept axis. */
  axis: string;
  plane: 'E' | 'H' | 'other';
  /** Pattern angles, both ends included; from < to, at most 360° apart. 360° is a periodic cut. */
  fromDeg: number;
  toDeg: number;
  stepDeg: number;
  /** Pattern angles of the other axes; 0 where not named. */
  at: Readonly<Record<string, number>>;
  autRollDeg: number;
  component: 'co' | 'cross';
}

export interface Plan {
  /** Absolute path and text as read. */
  path: string;
  text: string;
  kind: 'pattern' | 'reference';
  antenna: { name: string; revision: string };
  /** What is known of the antenna beforehand: largest dimension, gain as designed. */
  expected?: { sizeM?: number; gainDbi?: number };
  band: { startHz: number; stopHz: number; points: number };
  /** Frequencies the antenna is built for: match and tables are given there. */
  markersHz: readonly number[];
  analyzer: { ifBandwidthHz: number; powerDbm: number; averages: number };
  /** Which reference run gives the gain; only for kind `pattern`. */
  gainReference: 'latest' | 'none' | number;
  /** Empty only for kind `reference`, which then measures boresight alone. */
  cuts: readonly PlanCut[];
  /** A boresight tie after so many samples of a cut, beside those at its start and end. */
  tieEverySamples: number;
  /** Flag limits. */
  checks: { closureDb: number; driftDb: number };
}
