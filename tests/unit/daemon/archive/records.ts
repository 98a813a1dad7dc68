// Records as a run makes them, small and all different, for the tests of the archive.
import type {
  Archive,
  NewRun,
  RunEventRecord,
  SampleRecord,
  SegmentRecord,
  SetupRecord,
} from '../../../../daemon/archive/archive.ts';
import { DaemonError, type DaemonErrorCode } from '../../../../daemon/errors.ts';

export const newRun: NewRun = {
  kind: 'pattern',
  antenna: { name: 'yagi-5', revision: 'C' },
  range: 'roof',
  startedWallMs: 1_760_000_000_000.25,
  planText: 'antenna: yagi-5 # with a comment\n',
  plan: { antenna: 'yagi-5', cuts: [{ name: 'azimuth', stepDeg: 0.1 }], nothing: null },
  rangeText: 'name: roof\n',
  rangeFile: { name: 'roof', rangeLengthM: 7.3 },
};

export const segment: SegmentRecord = {
  segment: 1,
  reason: 'start',
  epochWallMs: 1_760_000_000_100.5,
  epochMonotonicMs: 81.125,
  analyzer: { maker: 'Own', model: 'VNA', serial: '7', firmware: '1.0' },
  controller: { family: 'realtime-status', firmware: '1.1', options: 'V' },
};

export const setup: SetupRecord = {
  setup: 1,
  sweep: {
    frequenciesHz: Float64Array.of(800e6, 850_000_000.1, 900e6),
    ifBandwidthHz: 1000,
    powerDbm: -10,
    averages: 2,
    parameters: ['S21', 'S11'],
    acquisitionMs: 12.5,
  },
  calibration: { correctionOn: true, interpolated: false, date: '2025-10-01' },
};

export function sample(sequence: number, over: Partial<SampleRecord> = {}): SampleRecord {
  return {
    segment: 1,
    sequence,
    setup: 1,
    purpose: 'cut',
    cut: 'azimuth',
    target: { azimuth: sequence * 0.1, elevation: -3 },
    axis: 'azimuth',
    angleDeg: sequence * 0.1 - 180,
    component: 'co',
    attempt: 1,
    startMonotonicMs: sequence * 100 + 0.5,
    stopMonotonicMs: sequence * 100 + 12.75,
    timeLaw: { kind: 'linear', firstMs: 0.25, lastMs: 11 },
    track: [{ monotonicMs: sequence * 100, position: { azimuth: sequence * 0.1 + 1e-9, elevation: -3 } }],
    traces: new Map([
      ['S21', Float64Array.of(sequence, -0, 1 / 3, Math.PI * sequence, 5e-324, 1e-7)],
      ['S11', Float64Array.of(0.1, 0.2, 0.3, 0.4, 0.5, -sequence)],
    ]),
    ...over,
  };
}

export const event: RunEventRecord = {
  segment: 0,
  wallMs: 1_760_000_000_000,
  monotonicMs: 3.5,
  kind: 'retry',
  text: 'a sweep was taken again',
  facts: { attempt: 2, code: 'LINK_TIMEOUT' },
};

/** A run with one segment and one setup, ready for samples; answers its number. */
export async function startRun(archive: Archive): Promise<number> {
  const { number } = await archive.createRun(newRun);
  await archive.addSegment(number, segment);
  await archive.addSetup(number, setup);
  return number;
}

/** The error of an act that must fail with this code. */
export async function failure(code: DaemonErrorCode, act: () => unknown): Promise<DaemonError> {
  let thrown: unknown;
  try {
    await act();
  } catch (error) {
    thrown = error;
  }
  if (!(thrown instanceof DaemonError) || thrown.code !== code) {
    throw new Error(`expected ${code}, met ${thrown === undefined ? 'no error' : thrown}`, { cause: thrown });
  }
  return thrown;
}
