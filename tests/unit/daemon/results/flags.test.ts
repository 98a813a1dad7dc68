// What is flagged, and in which words.
import { describe, expect, it } from 'vitest';
import type { Plan, PlanCut } from '../../../../daemon/files/plan-file.ts';
import { absentFigure } from '../../../../daemon/pattern/figure.ts';
import { cutFigures } from '../../../../daemon/pattern/figures.ts';
import type { CutLevels } from '../../../../daemon/results/cut-levels.ts';
import { entryOf } from '../../../../daemon/results/figure-entry.ts';
import type { CutFigures, Flag } from '../../../../daemon/results/figures-document.ts';
import { cutFlags } from '../../../../daemon/results/flags.ts';
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
