// Records of the archive as rows of its tables, and back. No SQL here, no storage. What JSON cannot say
// (NaN, infinities, nothing at all) is refused on the way in, where the caller can still be found.
import { DaemonError } from '../errors.ts';
import type {
  GainReferenceRecord,
  NewRun,
  RunEventRecord,
  RunKind,
  RunRecord,
  RunState,
  RunSummary,
  SamplePurpose,
  SampleRecord,
  SegmentRecord,
  SetupRecord,
} from './archive.ts';
import { decodeTraces, encodeTraces, pointsOf } from './trace-blob.ts';

type Row = Record<string, string | number | Buffer | null>;

export interface RunRow {
  number: number;
  uuid: string;
  kind: RunKind;
  state: RunState;
  antenna_name: string;
  antenna_revision: string;
  range_name: string;
  started_wall_ms: number;
  ended_wall_ms: number | null;
  reason: string | null;
  plan_text: string;
  plan_json: string;
  range_text: string;
  range_json: string;
  gain_reference_json: string | null;
}

export type SummaryRow = Omit<RunRow, 'plan_text' | 'plan_json' | 'range_text' | 'range_json'> & {
  samples: number;
};

export interface SegmentRow {
  segment: number;
  reason: string;
  epoch_wall_ms: number;
  epoch_monotonic_ms: number;
  analyzer_json: string;
  controller_json: string;
}

export interface SetupRow {
  setup: number;
  sweep_json: string;
  calibration_json: string;
}

export interface SampleRow {
  run: number;
  sequence: number;
  segment: number;
  setup: number;
  purpose: SamplePurpose;
  cut: string;
  target_json: string;
  axis: string;
  angle_deg: number;
  component: SampleRecord['component'];
  attempt: number;
  start_monotonic_ms: number;
  stop_monotonic_ms: number;
  law_kind: 'linear';
  law_first_ms: number;
  law_last_ms: number;
  track_json: string;
  traces: Buffer;
}

export interface EventRow {
  segment: number;
  wall_ms: number;
  monotonic_ms: number;
  kind: string;
  text: string;
  facts_json: string;
}

function defect(what: string, but: string): DaemonError {
  return new DaemonError('DEFECT', `the archive cannot keep ${what}: ${but}`, { what });
}

function finite(what: string, value: number): number {
  if (!Number.isFinite(value)) throw defect(what, `it is ${value}`);
  return value;
}

function jsonOf(what: string, value: unknown): string {
  const text = JSON.stringify(value, (_key, part: unknown) => {
    if (typeof part === 'number') return finite(what, part);
    return ArrayBuffer.isView(part) ? Array.from(part as Float64Array) : part;
  }) as string | undefined;
  if (text === undefined) throw defect(what, 'there is no value');
  return text;
}

/** Facts must never cost the event they belong to: what JSON has no word for is kept as text. */
function factsJsonOf(facts: RunEventRecord['facts']): string {
  return JSON.stringify(facts, (_key, part: unknown) => {
    if (typeof part === 'bigint' || (typeof part === 'number' && !Number.isFinite(part))) return `${part}`;
    if (part instanceof Error) return part.message;
    return ArrayBuffer.isView(part) ? Array.from(part as Float64Array) : part;
  });
}

export function rowOfRun(run: NewRun, uuid: string): Row {
  return {
    uuid,
    kind: run.kind,
    antenna_name: run.antenna.name,
    antenna_revision: run.antenna.revision,
    range_name: run.range,
    started_wall_ms: finite('startedWallMs', run.startedWallMs),
    plan_text: run.planText,
    plan_json: jsonOf('plan', run.plan),
    range_text: run.rangeText,
    range_json: jsonOf('rangeFile', run.rangeFile),
    gain_reference_json: run.gainReference === undefined ? null : jsonOf('gainReference', run.gainReference),
  };
}

export function runOfRow(row: RunRow): RunRecord {
  return {
    number: row.number,
    uuid: row.uuid,
    kind: row.kind,
    state: row.state,
    antenna: { name: row.antenna_name, revision: row.antenna_revision },
    range: row.range_name,
    startedWallMs: row.started_wall_ms,
    planText: row.plan_text,
    plan: JSON.parse(row.plan_json),
    rangeText: row.range_text,
    rangeFile: JSON.parse(row.range_json),
    ...(row.ended_wall_ms === null ? {} : { endedWallMs: row.ended_wall_ms }),
    ...(row.reason === null ? {} : { reason: row.reason }),
    ...(row.gain_reference_json === null
      ? {}
      : { gainReference: JSON.parse(row.gain_reference_json) as GainReferenceRecord }),
  };
}

export function summaryOfRow(row: SummaryRow): RunSummary {
  return {
    number: row.number,
    uuid: row.uuid,
    kind: row.kind,
    state: row.state,
    antenna: { name: row.antenna_name, revision: row.antenna_revision },
    range: row.range_name,
    startedWallMs: row.started_wall_ms,
    ...(row.ended_wall_ms === null ? {} : { endedWallMs: row.ended_wall_ms }),
    samples: row.samples,
  };
}

export function rowOfSegment(run: number, segment: SegmentRecord): Row {
  return {
    run,
    segment: segment.segment,
    reason: segment.reason,
    epoch_wall_ms: finite('epochWallMs', segment.epochWallMs),
    epoch_monotonic_ms: finite('epochMonotonicMs', segment.epochMonotonicMs),
    analyzer_json: jsonOf('analyzer', segment.analyzer),
    controller_json: jsonOf('controller', segment.controller),
  };
}

export function segmentOfRow(row: SegmentRow): SegmentRecord {
  return {
    segment: row.segment,
    reason: row.reason,
    epochWallMs: row.epoch_wall_ms,
    epochMonotonicMs: row.epoch_monotonic_ms,
    analyzer: JSON.parse(row.analyzer_json),
    controller: JSON.parse(row.controller_json),
  };
}

export function rowOfSetup(run: number, setup: SetupRecord): Row {
  return {
    run,
    setup: setup.setup,
    points: setup.sweep.frequenciesHz.length,
    sweep_json: jsonOf('sweep', setup.sweep),
    calibration_json: jsonOf('calibration', setup.calibration),
  };
}

export function setupOfRow(row: SetupRow): SetupRecord {
  const sweep = JSON.parse(row.sweep_json);
  return {
    setup: row.setup,
    sweep: { ...sweep, frequenciesHz: Float64Array.from(sweep.frequenciesHz as number[]) },
    calibration: JSON.parse(row.calibration_json),
  };
}

export function rowOfSample(run: number, sample: SampleRecord): Row {
  return {
    run,
    sequence: sample.sequence,
    segment: sample.segment,
    setup: sample.setup,
    points: pointsOf(sample.traces),
    purpose: sample.purpose,
    cut: sample.cut,
    target_json: jsonOf('target', sample.target),
    axis: sample.axis,
    angle_deg: finite('angleDeg', sample.angleDeg),
    component: sample.component,
    attempt: sample.attempt,
    start_monotonic_ms: finite('startMonotonicMs', sample.startMonotonicMs),
    stop_monotonic_ms: finite('stopMonotonicMs', sample.stopMonotonicMs),
    law_kind: sample.timeLaw.kind,
    law_first_ms: finite('timeLaw.firstMs', sample.timeLaw.firstMs),
    law_last_ms: finite('timeLaw.lastMs', sample.timeLaw.lastMs),
    track_json: jsonOf('track', sample.track),
    traces: encodeTraces(sample.traces),
  };
}

/** Throws ARCHIVE_DAMAGED when the traces are not as they were written. */
export function sampleOfRow(row: SampleRow): SampleRecord {
  return {
    segment: row.segment,
    sequence: row.sequence,
    setup: row.setup,
    purpose: row.purpose,
    cut: row.cut,
    target: JSON.parse(row.target_json),
    axis: row.axis,
    angleDeg: row.angle_deg,
    component: row.component,
    attempt: row.attempt,
    startMonotonicMs: row.start_monotonic_ms,
    stopMonotonicMs: row.stop_monotonic_ms,
    timeLaw: { kind: row.law_kind, firstMs: row.law_first_ms, lastMs: row.law_last_ms },
    track: JSON.parse(row.track_json),
    traces: decodeTraces(row.traces, { run: row.run, sequence: row.sequence }),
  };
}

export function rowOfEvent(run: number, event: RunEventRecord): Row {
  return {
    run,
    segment: event.segment,
    wall_ms: finite('wallMs', event.wallMs),
    monotonic_ms: finite('monotonicMs', event.monotonicMs),
    kind: event.kind,
    text: event.text,
    facts_json: factsJsonOf(event.facts),
  };
}

export function eventOfRow(row: EventRow): RunEventRecord {
  return {
    segment: row.segment,
    wallMs: row.wall_ms,
    monotonicMs: row.monotonic_ms,
    kind: row.kind,
    text: row.text,
    facts: JSON.parse(row.facts_json),
  };
}
