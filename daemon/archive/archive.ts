// What the archive keeps and promises, whatever stands behind it. Samples are never altered; everything
// derived from them can be derived again. Every call is a promise, so that storage may live on a worker,
// in memory (nights) or elsewhere. A promise of a write resolves when the write is durable.
import type {
  AnalyzerIdentity,
  PreparedSweep,
  SParameter,
  TimeLaw,
} from '../../drivers/analyzer/analyzer.ts';
import type { AxisName, ControllerIdentity, Position } from '../../drivers/positioner/positioner.ts';

export type RunKind = 'pattern' | 'reference' | 'floor' | 'trim' | 'import';

/** `running` is what a dead process leaves behind; `interrupted` can be resumed; `failed` cannot. */
export type RunState = 'running' | 'complete' | 'interrupted' | 'failed';

export interface NewRun {
  kind: RunKind;
  antenna: { name: string; revision: string };
  /** The range's name in its file. */
  range: string;
  startedWallMs: number;
  /** Frozen as they were read: the text of both files, and the checked values as JSON. */
  planText: string;
  plan: unknown;
  rangeText: string;
  rangeFile: unknown;
  /** The gain reference this run takes its gain from, frozen with its values; absent for none. */
  gainReference?: GainReferenceRecord;
}

export interface GainReferenceRecord {
  runUuid: string;
  runNumber: number;
  antenna: string;
  /** N entries each, in the order of the run's frequencies. */
  frequenciesHz: number[];
  realizedGainDbi: number[];
  /** Received level of the reference at boresight, 20 log|S21|. */
  levelDb: number[];
}

export interface RunRef {
  number: number;
  uuid: string;
}

export interface RunRecord extends RunRef, NewRun {
  state: RunState;
  endedWallMs?: number;
  /** Why it ended, when it did not complete. */
  reason?: string;
}

export interface RunSummary extends RunRef {
  kind: RunKind;
  state: RunState;
  antenna: { name: string; revision: string };
  range: string;
  startedWallMs: number;
  endedWallMs?: number;
  samples: number;
}

/** A part of a run between interruptions: own clock epoch, homing and ties. */
export interface SegmentRecord {
  /** 1, 2 … within the run. */
  segment: number;
  reason: string;
  /** Wall time and monotonic time of one and the same moment: turns sample times into wall times. */
  epochWallMs: number;
  epochMonotonicMs: number;
  analyzer: AnalyzerIdentity;
  controller: ControllerIdentity;
}

/** What the analyzer confirmed; samples point to it. */
export interface SetupRecord {
  setup: number;
  sweep: PreparedSweep;
  calibration: { correctionOn: boolean; interpolated?: boolean; date?: string };
}

/**
 * `cut`: part of a cut; `tie`: boresight or flank revisited; `closure`: the end of a full turn, again;
 * `repeat`: a position of an interrupted run once more, to compare.
 */
export type SamplePurpose = 'cut' | 'tie' | 'closure' | 'reference' | 'repeat';

/** Where the axes were at a moment of the segment's clock. One entry at rest, many in motion. */
export interface TrackPoint {
  monotonicMs: number;
  position: Position;
}

export interface SampleRecord {
  segment: number;
  /** 1, 2 … within the run, in order of acquisition. */
  sequence: number;
  setup: number;
  purpose: SamplePurpose;
  /** Cut it belongs to; ties name the cut they were taken for, or ''. */
  cut: string;
  /** The position asked for, in degrees by axis. */
  target: Position;
  /** Swept axis and its pattern angle, where there is one. */
  axis: AxisName;
  angleDeg: number;
  component: 'co' | 'cross' | 'left' | 'right';
  /** 1 for the first try; retries count up. */
  attempt: number;
  startMonotonicMs: number;
  stopMonotonicMs: number;
  timeLaw: TimeLaw;
  track: TrackPoint[];
  /** Complex traces, interleaved re, im, length 2N. */
  traces: ReadonlyMap<SParameter, Float64Array>;
}

/** What happened beside the samples: homing, retries, flags, notes. */
export interface RunEventRecord {
  segment: number;
  wallMs: number;
  monotonicMs: number;
  /** Kind of event, such as `homed`, `retry`, `recovered`, `flag`, `ended`. */
  kind: string;
  text: string;
  facts: Readonly<Record<string, unknown>>;
}

export interface SampleFilter {
  purposes?: readonly SamplePurpose[];
  cut?: string;
}

export interface Archive {
  createRun(run: NewRun): Promise<RunRef>;
  addSegment(run: number, segment: SegmentRecord): Promise<void>;
  addSetup(run: number, setup: SetupRecord): Promise<void>;
  /** Resolves when the sample would survive the loss of process and power. Never altered afterwards. */
  addSample(run: number, sample: SampleRecord): Promise<void>;
  addEvent(run: number, event: RunEventRecord): Promise<void>;
  endRun(
    run: number,
    state: Exclude<RunState, 'running'>,
    endedWallMs: number,
    reason?: string,
  ): Promise<void>;
  /** Newest first. */
  runs(): Promise<RunSummary[]>;
  /** Throws ARCHIVE_NO_SUCH_RUN. */
  run(number: number): Promise<RunRecord>;
  segments(run: number): Promise<SegmentRecord[]>;
  setups(run: number): Promise<SetupRecord[]>;
  /** In order of sequence. Throws ARCHIVE_DAMAGED when a blob fails its checksum. */
  samples(run: number, filter?: SampleFilter): Promise<SampleRecord[]>;
  events(run: number): Promise<RunEventRecord[]>;
  close(): Promise<void>;
}
