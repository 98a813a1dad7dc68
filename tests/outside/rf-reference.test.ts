// Random questions, asked of the pattern mathematics and of reference libraries (scikit-rf, numpy, scipy)
// through rf-reference.py. Seeds are fixed and printed; a failure names the question.
import { spawnSync } from 'node:child_process';
import { fileURLToPath } from 'node:url';
import { beforeAll, describe, expect } from 'vitest';
import { wrapDeg } from '../../daemon/pattern/angles.ts';
import { beamwidth } from '../../daemon/pattern/beamwidth.ts';
import { type Cut, cutFromSamples } from '../../daemon/pattern/cut.ts';
import { driftOf } from '../../daemon/pattern/drift.ts';
import type { Figure } from '../../daemon/pattern/figure.ts';
import { cutFigures } from '../../daemon/pattern/figures.ts';
import { tableGainDbi } from '../../daemon/pattern/gain-transfer.ts';
import { levelAt } from '../../daemon/pattern/level-at.ts';
import { impedance, mismatchLossDb, returnLossDb, vswr } from '../../daemon/pattern/match.ts';
import { peakOf } from '../../daemon/pattern/peak.ts';
import { itWithTool } from '../support/outside-tool.ts';
import type { Answers, Questions } from './rf-questions.ts';
import { askQuestions } from './rf-questions.ts';

const seed = 868_2024;
const python = ['/usr/bin/python3', 'python3'].find(
  (path) => spawnSync(path, ['-c', 'import numpy, scipy, skrf']).status === 0,
);
const it = itWithTool(
  python === undefined
    ? 'no python3 with numpy, scipy and scikit-rf (on Debian: apt install python3-numpy python3-scipy python3-scikit-rf)'
    : undefined,
);

/** Both sides work closed forms in double precision; what they round differs in the last few of 16 digits. */
const sameFormula = 1e-12;

let questions: Questions;
let answers: Answers;

function value(figure: Figure): number {
  expect(figure.kind, JSON.stringify(figure)).toBe('value');
  return figure.kind === 'value' ? figure.value : Number.NaN;
}

function near(ours: number, theirs: number, tolerance: number, question: string): void {
  expect(Math.abs(ours - theirs), `${question}: ours ${ours}, theirs ${theirs}`).toBeLessThanOrEqual(
    tolerance,
  );
}

describe('reference libraries', () => {
  beforeAll(() => {
    questions = askQuestions(seed);
    const script = fileURLToPath(new URL('rf-reference.py', import.meta.url));
    const told = spawnSync(python!, [script], {
      input: JSON.stringify(questions),
      encoding: 'utf8',
      maxBuffer: 64e6,
    });
    expect(told.status, told.stderr).toBe(0);
    answers = JSON.parse(told.stdout);
    const versions = Object.entries(answers.versions).map(([name, version]) => `${name} ${version}`);
    console.info(`reference libraries: ${versions.join(', ')}; seed ${seed}`);
  });

  it('agree on VSWR, return loss, mismatch loss and impedance of 500 reflection coefficients', () => {
    const { re, im } = questions.match;
    const theirs = answers.match;
    expect(theirs.vswr).toHaveLength(500);
    for (const [k, real] of re.entries()) {
      const imaginary = im[k]!;
      const size = Math.hypot(real, imaginary);
      const name = `Γ = ${real} + j ${imaginary}`;
      near(value(vswr(size)), theirs.vswr[k]!, sameFormula * theirs.vswr[k]!, name);
      near(value(returnLossDb(size)), theirs.returnLossDb[k]!, sameFormula * theirs.returnLossDb[k]!, name);
      // From impedances there, from |Γ| here: the difference of two nearly equal powers costs some digits.
      near(value(mismatchLossDb(size)), theirs.mismatchLossDb[k]!, 1e-11, name);
      const z = impedance(real, imaginary);
      expect(z.kind).toBe('value');
      if (z.kind !== 'value') continue;
      const sizeOhm = Math.hypot(theirs.resistanceOhm[k]!, theirs.reactanceOhm[k]!);
      near(z.resistanceOhm, theirs.resistanceOhm[k]!, sameFormula * sizeOhm, name);
      near(z.reactanceOhm, theirs.reactanceOhm[k]!, sameFormula * sizeOhm, name);
    }
  });

  /** Each pattern as the daemon is handed it: 360 levels, one a degree. */
  function eachPattern(
    check: (cut: Cut, theirs: Answers['patterns'][number], name: string, k: number) => void,
  ): void {
    expect(answers.patterns).toHaveLength(60);
    for (const [k, theirs] of answers.patterns.entries()) {
      const { cut } = cutFromSamples(theirs);
      expect(cut.periodic).toBe(true);
      check(cut, theirs, `seed ${seed}, pattern ${k} ${JSON.stringify(questions.patterns[k])}`, k);
    }
  }

  it('interpolate levels as numpy.interp does', () => {
    eachPattern((cut, theirs, name, k) => {
      for (const [asked, deg] of questions.patterns[k]!.askedDeg.entries()) {
        near(value(levelAt(cut, deg)), theirs.straightDb[asked]!, 1e-11, `${name} at ${deg}°`);
      }
    });
  });

  it('place the vertex of the peak where numpy.polyfit does, and crossings where scipy does', () => {
    eachPattern((cut, theirs, name) => {
      const peak = peakOf(cut);
      // A parabola through three points keeps some 12 digits.
      near(wrapDeg(peak.angleDeg - theirs.vertexDeg), 0, 1e-9, name);
      near(peak.levelDb, theirs.vertexDb, 1e-11, name);
      const width = beamwidth(cut, peak, { referenceDb: cut.levelDb[peak.index]!, dropDb: 5 });
      expect(width.kind, name).toBe('value');
      if (width.kind !== 'value') return;
      near(width.leftOffsetDeg, theirs.straightLeftDeg, 1e-10, name);
      near(width.rightOffsetDeg, theirs.straightRightDeg, 1e-10, name);
    });
  });

  it('find the true peak, beamwidths and front-to-back of the formula behind the samples', () => {
    eachPattern((cut, theirs, name) => {
      const figures = cutFigures(cut, { gainConstantDb: 0 });
      // A parabola over ±h misses the top of a skew lobe by h²/6 of its third over its second derivative; what
      // the fourth leaves at a beam of 20° or more is below 0.001°.
      const peakDeg = theirs.skewness / 6 + 0.001;
      expect(peakDeg, name).toBeLessThan(0.02);
      near(wrapDeg(value(figures.peakDeg) - theirs.peakDeg), 0, peakDeg, name);
      // The beam's top is a curve of the fourth degree over 0.4 of the beam: promised to 0.0001 dB for smooth lobes.
      const topDb = 0.0001;
      near(value(figures.realizedGainDbi!), theirs.peakDb, topDb, name);
      for (const [key, width] of [
        ['halfPowerBeamwidthDeg', theirs.halfPower],
        ['tenDbBeamwidthDeg', theirs.tenDb],
      ] as const) {
        if (!width) {
          expect(figures[key].kind, name).toBe('absent');
          continue;
        }
        // The chord between two samples lies off the curve by what its curvature allows; the top by topDb.
        const tolerance = width.chordErrorDeg + topDb * width.degPerDb;
        expect(tolerance, name).toBeLessThan(0.01 * width.widthDeg);
        near(value(figures[key]), width.widthDeg, tolerance, `${key} of ${name}`);
      }
      // The peak's level by a parabola, its angle as above, the back within the chord of its own curvature.
      const backDb = topDb + theirs.oppositeBend / 8 + peakDeg * theirs.oppositeSlope;
      near(value(figures.frontToBackDb), theirs.peakDb - theirs.oppositeDb, backDb, name);
    });
  });

  it('bring drift back as numpy.unwrap and numpy.interp do, also beyond the ties', () => {
    expect(answers.drifts).toHaveLength(40);
    for (const [k, theirs] of answers.drifts.entries()) {
      const { timesMs, re, im, askedMs } = questions.drifts[k]!;
      const drift = driftOf(timesMs.map((timeMs, t) => ({ timeMs, trace: Float64Array.of(re[t]!, im[t]!) })));
      expect(drift.kind).toBe('value');
      if (drift.kind !== 'value') continue;
      near(value(drift.driftDb[0]!), theirs.driftDb, 1e-11, `drift ${k}`);
      near(value(drift.turnDeg[0]!), theirs.turnDeg, 1e-10, `turn ${k}`);
      for (const [asked, timeMs] of askedMs.entries()) {
        const factors = drift.factorsAt(timeMs);
        near(factors[0]!, theirs.re[asked]!, sameFormula, `drift ${k} at ${timeMs} ms`);
        near(factors[1]!, theirs.im[asked]!, sameFormula, `drift ${k} at ${timeMs} ms`);
      }
    }
    // Several of them turn by more than a full turn in all: unwrapping was asked for.
    expect(answers.drifts.filter(({ turnDeg }) => turnDeg > 360).length).toBeGreaterThan(3);
  });

  it('read a gain table as numpy.interp does', () => {
    const { frequenciesHz, gainDbi, askedHz } = questions.gainTable;
    const table = frequenciesHz.map((frequencyHz, k) => ({ frequencyHz, gainDbi: gainDbi[k]! }));
    for (const [k, frequencyHz] of askedHz.entries()) {
      near(tableGainDbi(table, frequencyHz), answers.gainTable[k]!, sameFormula, `${frequencyHz} Hz`);
    }
  });
});
