// From stored samples to the document: a known pattern, known drift, known reference; worked by hand here.
import { afterEach, describe, expect, it } from 'vitest';
import type { GainReferenceRecord, SampleRecord } from '../../../../daemon/archive/archive.ts';
import { InThreadArchive } from '../../../../daemon/archive/in-thread-archive.ts';
import { figuresDocument } from '../../../../daemon/results/figures-document.ts';
import { runFigures } from '../../../../daemon/results/run-figures.ts';
import { fakeAxis } from '../../../support/fake-devices.ts';

const frequenciesHz = Float64Array.of(860e6, 868e6, 876e6);
const identity = { maker: 'm', model: 'a', serial: '1', firmware: '1' };

let archive: InThreadArchive | undefined;
afterEach(async () => {
  await archive?.close();
});

/** Amplitude of a cosine-squared beam on a back lobe 20 dB down, at 0 dB on boresight. */
function amplitude(angleDeg: number): number {
  const c = Math.cos((angleDeg * Math.PI) / 180);
  return c > 0 ? Math.max(c, 0.1) : 0.1;
}

interface Recorded {
  /** Level drift in dB over the run, linear in time. */
  driftDb?: number;
  closureDb?: number;
  gainReference?: GainReferenceRecord;
  correctionOn?: boolean;
  samples?: (all: SampleRecord[]) => SampleRecord[];
}

async function record(recorded: Recorded = {}): Promise<number> {
  archive = InThreadArchive.open(':memory:');
  const { number } = await archive.createRun({
    kind: 'pattern',
    antenna: { name: 'gauge', revision: 'A' },
    range: 'meadow',
    startedWallMs: 1,
    planText: '',
    plan: {
      kind: 'pattern',
      markersHz: [868e6],
      cuts: [
        {
          name: 'azimuth',
          axis: 'azimuth',
          plane: 'H',
          fromDeg: -180,
          toDeg: 180,
          stepDeg: 1,
          at: {},
          autRollDeg: 0,
          component: 'co',
        },
      ],
      checks: { closureDb: 0.2, driftDb: 0.5 },
    },
    rangeText: '',
    rangeFile: { analyzer: { autPort: 1 }, positioner: { axes: [fakeAxis()] } },
    ...(recorded.gainReference ? { gainReference: recorded.gainReference } : {}),
  });
  await archive.addSegment(number, {
    segment: 1,
    reason: 'start',
    epochWallMs: 0,
    epochMonotonicMs: 0,
    analyzer: identity,
    controller: { family: 'realtime-status', firmware: 'f', options: '' },
  });
  await archive.addSetup(number, {
    setup: 1,
    sweep: {
      frequenciesHz,
      ifBandwidthHz: 1000,
      powerDbm: 0,
      averages: 1,
      parameters: ['S21', 'S11'],
      acquisitionMs: 10,
    },
    calibration: { correctionOn: recorded.correctionOn ?? true },
  });
  const all = samplesOf(recorded);
  for (const sample of recorded.samples ? recorded.samples(all) : all)
    await archive.addSample(number, sample);
  await archive.endRun(number, 'complete', 2);
  return number;
}

function samplesOf(recorded: Recorded): SampleRecord[] {
  const angles = Array.from({ length: 361 }, (_, i) => i - 180);
  const list: [SampleRecord['purpose'], number][] = [
    ['tie', 0],
    ...angles.map((angle): [SampleRecord['purpose'], number] => [angle === 180 ? 'closure' : 'cut', angle]),
    ['tie', 0],
  ];
  return list.map(([purpose, angleDeg], index) => {
    const driftDb = ((recorded.driftDb ?? 0) * index) / (list.length - 1);
    const closureDb = purpose === 'closure' ? (recorded.closureDb ?? 0) : 0;
    const level = 0.01 * amplitude(angleDeg) * 10 ** ((driftDb + closureDb) / 20);
    return {
      segment: 1,
      sequence: index + 1,
      setup: 1,
      purpose,
      cut: 'azimuth',
      target: { azimuth: angleDeg },
      axis: 'azimuth',
      angleDeg,
      component: 'co',
      attempt: 1,
      startMonotonicMs: 1000 * index,
      stopMonotonicMs: 1000 * index + 10,
      timeLaw: { kind: 'linear', firstMs: 0, lastMs: 10 },
      track: [{ monotonicMs: 1000 * index, position: { azimuth: angleDeg } }],
      traces: new Map(
        purpose === 'tie'
          ? [
              ['S21', Float64Array.of(level, 0, level, 0, level, 0)],
              // |Γ| = 0.5 at both ends, 0.1 in the middle.
              ['S11', Float64Array.of(0.5, 0, 0, 0.1, -0.5, 0)],
            ]
          : [['S21', Float64Array.of(level, 0, level, 0, level, 0)]],
      ),
    };
  });
}

function figure(document: Awaited<ReturnType<typeof runFigures>>, key: string, k = 1): unknown {
  return document.cuts[0]?.figures[key as 'peakDeg']?.[k];
}

describe('the figures of a stored run', () => {
  it('fit the schema and give the pattern that was put in', async () => {
    const number = await record();
    const document = await runFigures(archive!, number);
    expect(figuresDocument.safeParse(document).error).toBeUndefined();
    expect(figure(document, 'peakDeg')).toMatchObject({ value: expect.closeTo(0, 6) });
    // cos² falls to half at ±45°: 90° between.
    expect(figure(document, 'halfPowerBeamwidthDeg')).toMatchObject({ value: expect.closeTo(90, 1) });
    expect(figure(document, 'frontToBackDb')).toMatchObject({ value: expect.closeTo(20, 3) });
    expect(figure(document, 'realizedGainDbi')).toEqual({ absent: 'the run has no gain reference' });
    expect(document.flags).toEqual([]);
    expect(document.cuts[0]?.anglesDeg).toHaveLength(360);
  });

  it('take drift out: the same pattern with 2 dB of drift, which is flagged', async () => {
    const number = await record({ driftDb: 2 });
    const document = await runFigures(archive!, number);
    expect(figure(document, 'halfPowerBeamwidthDeg')).toMatchObject({ value: expect.closeTo(90, 1) });
    expect(figure(document, 'frontToBackDb')).toMatchObject({ value: expect.closeTo(20, 3) });
    expect(figure(document, 'driftDb')).toMatchObject({ value: expect.closeTo(2, 6) });
    expect(document.flags.map((flag) => flag.code)).toEqual(['DRIFT_LARGE']);
  });

  it('give gain by transfer: reference gain plus how much more was received', async () => {
    const number = await record({
      gainReference: {
        runUuid: 'u',
        runNumber: 9,
        antenna: 'dipole',
        frequenciesHz: [...frequenciesHz],
        realizedGainDbi: [2, 2.1, 2.2],
        levelDb: [-50, -49, -48],
      },
    });
    const document = await runFigures(archive!, number);
    // The boresight level is 20 log 0.01 = −40 dB: 2.1 + (−40 + 49) = 11.1 dBi.
    // The top of the beam is a curve of the fourth degree: 0.0001 dB on a cosine.
    expect(figure(document, 'realizedGainDbi')).toMatchObject({ value: expect.closeTo(11.1, 3) });
    // |Γ| = 0.1: mismatch loss −10 log(1 − 0.01) = 0.0436 dB.
    expect(figure(document, 'gainDbi')).toMatchObject({ value: expect.closeTo(11.1436, 3) });
    expect(figure(document, 'realizedGainDbi', 0)).toMatchObject({ value: expect.closeTo(12, 3) });
  });

  it('tell the match', async () => {
    const number = await record();
    const { match } = await runFigures(archive!, number);
    // |Γ| = 0.5: VSWR 3, return loss 6.02 dB; |Γ| = 0.1: VSWR 1.2222, 20 dB.
    expect(match?.vswr[0]).toMatchObject({ value: expect.closeTo(3, 6) });
    expect(match?.vswr[1]).toMatchObject({ value: expect.closeTo(1.1 / 0.9, 6) });
    expect(match?.returnLossDb[1]).toMatchObject({ value: expect.closeTo(20, 6) });
    expect(match?.bestMatchHz).toMatchObject({ value: expect.closeTo(868e6, -3) });
  });

  it('know no match from noise: a well-matched antenna at eight ties', async () => {
    // |S11| of 1e-4 in a direction of its own at each of 8 ties and 3 frequencies: 80 dB down, the mean 89 dB.
    const traceOf = (tie: number): Float64Array =>
      Float64Array.from({ length: 6 }, (_, i) => {
        const turn = 2.4 * (3 * tie + (i >> 1)) ** 1.7;
        return 1e-4 * (i % 2 === 0 ? Math.cos(turn) : Math.sin(turn));
      });
    const number = await record({
      samples: (all) => {
        const tie = all[0]!;
        const ties = Array.from({ length: 8 }, (_, k) => ({
          ...tie,
          traces: new Map([...tie.traces, ['S11' as const, traceOf(k)]]),
        }));
        return [...ties, ...all.slice(1, -1)].map((sample, index) => ({
          ...sample,
          sequence: index + 1,
          startMonotonicMs: 1000 * index,
          stopMonotonicMs: 1000 * index + 10,
        }));
      },
    });
    const { match } = await runFigures(archive!, number);
    expect(match?.bestMatchHz).toMatchObject({ absent: expect.stringContaining('alike') });
    expect(match?.resonanceHz).toMatchObject({ absent: expect.stringContaining('noise') });
    expect(match?.lengthScale).toEqual({ absent: 'no resonance was found in the band' });
    for (const entry of match?.returnLossDb ?? []) {
      if ('absent' in entry) throw new Error(entry.absent);
      expect(entry.value).toBeGreaterThan(80);
      if (entry.bound)
        expect(entry).toMatchObject({ bound: 'lower', note: expect.stringContaining('noise') });
    }
    const bounds = (entries: object[] | undefined) => entries?.map((entry) => 'bound' in entry);
    expect(bounds(match?.returnLossDb)).toContain(true);
    expect(bounds(match?.vswr)).toEqual(bounds(match?.returnLossDb));
  });

  it('flag a closure beyond the limit, and a calibration that is off', async () => {
    const number = await record({ closureDb: 0.4, correctionOn: false });
    const document = await runFigures(archive!, number);
    expect(document.flags.map((flag) => flag.code).sort()).toEqual(['CALIBRATION_OFF', 'CLOSURE_LARGE']);
    expect(figure(document, 'closureDb')).toMatchObject({ value: expect.closeTo(0.4, 3) });
  });

  it('say why there are none when a run ended after two samples', async () => {
    const number = await record({ samples: (all) => all.slice(0, 3) });
    const document = await runFigures(archive!, number);
    expect(document.flags.map((flag) => flag.code)).toEqual(['CUT_INCOMPLETE']);
    expect(figure(document, 'closureDb')).toEqual({
      absent: 'the cut has 2 samples; a pattern needs three or more',
    });
  });
});
