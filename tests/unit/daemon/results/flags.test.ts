// What is flagged, and in which words.
import { describe, expect, it } from 'vitest';
import type { Plan, PlanCut } from '../../../../daemon/files/plan-file.ts';
import { absentFigure, type Figure, valueFigure } from '../../../../daemon/pattern/figure.ts';
import { cutFigures } from '../../../../daemon/pattern/figures.ts';
import type { CutLevels } from '../../../../daemon/results/cut-levels.ts';
import { entryOf } from '../../../../daemon/results/figure-entry.ts';
import type { CutFigures, Flag } from '../../../../daemon/results/figures-document.ts';
import { cutFlags, runFlags } from '../../../../daemon/results/flags.ts';
import { parabola, turn } from '../pattern/cut-samples.ts';

const planCut: PlanCut = {
  name: 'azimuth',
  axis: 'azimuth',
  plane: 'H',
  fromDeg: -180,
  toDeg: 180,
  stepDeg: 1,
  at: {},
  autRollDeg: 0,
  component: 'co',
};
const plan = { checks: { closureDb: 0.2, driftDb: 0.5 } } as Plan;
const none = absentFigure('none');

/** Figures of a cut whose beam has the given widths, one per frequency, as measured with the step. */
function figuresOf(widthsDeg: number[], stepDeg: number): CutFigures {
  const cuts = widthsDeg.map((widthDeg) => turn((deg) => Math.max(-30, parabola(widthDeg)(deg)), stepDeg));
  const { fromDeg: _, toDeg: __, stepDeg: ___, ...head } = planCut;
  return {
    ...head,
    at: {},
    gated: false,
    anglesDeg: Array.from(cuts[0]?.anglesDeg ?? []),
    figures: { halfPowerBeamwidthDeg: cuts.map((cut) => entryOf(cutFigures(cut).halfPowerBeamwidthDeg)) },
  };
}

function flagged(widthsDeg: number[], stepDeg: number, levels: Partial<CutLevels> = {}): Flag[] {
  return cutFlags(
    plan,
    planCut,
    { cuts: [], closureDb: [none], driftDb: [none], ...levels },
    figuresOf(widthsDeg, stepDeg),
  );
}

describe('a step too coarse for the beam', () => {
  it.each([
    [61, 1],
    [49, 1],
    [17.6, 1],
    [17.6, 0.5],
    [25, 2],
  ])('is not said of a beam of %d° at %d°', (widthDeg, stepDeg) => {
    expect(flagged([widthDeg], stepDeg)).toEqual([]);
  });

  it.each([
    [17.6, 2],
    [6, 1],
    [23, 2],
    [2, 0.5],
  ])('is said of a beam of %d° at %d°', (widthDeg, stepDeg) => {
    expect(flagged([widthDeg], stepDeg)).toMatchObject([{ code: 'STEP_COARSE', cut: 'azimuth' }]);
  });

  it('tells step, beamwidth, what a reading may lack, and the step to take', () => {
    // 2°²/(2 · 17.6°) = 0.114°, 0.65 % of it; 17.6°/12 = 1.47°. The width as read is up to 0.1° less.
    const { text } = flagged([17.6], 2)[0]!;
    expect(text).toMatch(/^azimuth: the step of 2° is coarse for a half-power beamwidth of 17\.[56]°/);
    expect(text).toContain('median over the band');
    expect(text).toMatch(/up to 0\.1° \(0\.[67] %, an estimate\) narrow/);
    expect(text).toMatch(/steps of 1\.4° or less$/);
    // 1°²/(2 · 6°) = 0.083°, 1.4 % of it; 6°/12 = 0.5°, and the samples at ±3° read it exactly.
    expect(flagged([6], 1)[0]?.text).toMatch(/up to 0\.08° \(1\.4 %.*steps of 0\.5° or less$/);
  });

  it('goes by the median over the band', () => {
    expect(flagged([6, 17.6, 61], 1)).toEqual([]);
    expect(flagged([6, 7, 61], 1)).toHaveLength(1);
    expect(flagged([], 1)).toEqual([]);
    // Omnidirectional: no beamwidth at all.
    expect(flagged([4000, 4000], 5)).toEqual([]);
  });
});

describe('closure and drift', () => {
  const figures = (...values: number[]): Figure[] => values.map((value) => valueFigure(value));

  it('are judged by the median over the band, and say so', () => {
    const [closure, drift] = flagged([61], 1, {
      closureDb: figures(0.1, -0.34, 9),
      driftDb: figures(0.1, 0.72, 9),
    });
    expect(closure).toMatchObject({ code: 'CLOSURE_LARGE', text: expect.stringContaining('0.34 dB') });
    expect(closure?.text).toContain('median over the band');
    expect(drift).toMatchObject({ code: 'DRIFT_LARGE', text: expect.stringContaining('0.72 dB') });
    expect(drift?.text).toContain('median over the band');
    expect(flagged([61], 1, { closureDb: figures(0.1, 0.1, 9), driftDb: figures(0.1, 0.2, 9) })).toEqual([]);
  });
});

describe('a run with interruptions', () => {
  it.each([
    [2, 'complete', 'the run was interrupted once and went on by itself'],
    [3, 'complete', 'the run was interrupted twice and went on by itself'],
    [6, 'complete', 'the run was interrupted 5 times and went on by itself'],
    [2, 'failed', 'the run was interrupted once'],
    [3, 'running', 'the run was interrupted twice'],
    // The end of the last segment is one more.
    [2, 'interrupted', 'the run was interrupted twice'],
  ] as const)('of %d segments, %s: %s', (segments, state, text) => {
    expect(runFlags([], segments, state)).toEqual([{ code: 'RUN_INTERRUPTED', text }]);
  });

  it('is not flagged for its only segment', () => {
    expect(runFlags([], 1, 'complete')).toEqual([]);
    // The document's state says that one.
    expect(runFlags([], 1, 'interrupted')).toEqual([]);
  });
});
