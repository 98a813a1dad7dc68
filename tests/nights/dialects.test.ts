// Whole runs on analyzers of other shapes, described in the range file: the samples are those of the scene, also
// when the power of the analyzer is cut on the way.
import { afterEach, expect, it } from 'vitest';
import type { ScpiInstrumentOptions } from '../../mocks/analyzer/scpi-instrument.ts';
import { patternPlan, SimulatedRange } from '../support/simulated-range.ts';

const ranges: SimulatedRange[] = [];
afterEach(async () => {
  for (const range of ranges.splice(0)) await range.close();
});

const described: [NonNullable<ScpiInstrumentOptions['commandTree']>, string][] = [
  ['named-measurement', 'named-measurement'],
  ['selected-trace', 'selected-trace'],
  [
    'named-measurement',
    `
    base: named-measurement
    completion: { by: poll, query: ":STAT:OPER:COND?", until: "0" }
    templates:
      output: ":OUTP {oneZero}"
      averagingByPoint: none
      averagingModeQuery: none
      parameterDefine:
        - ":CALC{channel}:PAR:DEF:EXT 'NC{trace}','{parameter}'"
        - ":DISP:WIND:TRAC{trace}:FEED 'NC{trace}'"`,
  ],
  [
    // From the dialect of another tree to that of this one, template by template.
    'selected-trace',
    `
    base: numbered-parameter
    completion: { by: wait, factor: 1.2 }
    templates:
      continuousOff: ":SWE:MODE HOLD"
      continuousQuery: ":SWE:MODE?"
      startSweep: ":SWE:MODE SING"
      parameterCount: none
      parameterCountQuery: none
      parameterDefine: ":CALC:MEAS{trace}:DEF '{parameter}'"
      parameterDefineQuery: ":CALC:MEAS{trace}:DEF?"
      parameterSelect: none
      dataQuery: ":CALC:MEAS{trace}:DATA:SDAT?"
      frequencyAxisQuery: ":CALC:MEAS{trace}:X?"`,
  ],
];

it.each(described)('a run on the tree of %s, described: %j', async (commandTree, dialect) => {
  const range = new SimulatedRange({
    dialect,
    bench: {
      scene: { seed: 3, noise: { snrDb: 90, reflectionSnrDb: 90 } },
      analyzer: { commandTree },
    },
  });
  ranges.push(range);
  range.bench.faults.injectAfter('power-cycle', 100);
  const plan = patternPlan(['azimuth'], { gainReference: 'none', points: 11, stepDeg: 30 });
  const outcome = await range.measure(plan);
  expect(outcome.error).toBeUndefined();
  expect(outcome.state).toBe('complete');
  expect(range.bench.faults.journal).toHaveLength(1);
  expect(range.bench.instrument.settings.outputOn).toBe(false);
  const samples = (await range.archive.samples(outcome.run.number)).filter(({ cut }) => cut === 'azimuth');
  expect(samples.length).toBeGreaterThanOrEqual(13);
  for (const { target, traces } of samples) {
    for (const [parameter, trace] of traces) {
      for (let k = 0; k < 11; k += 1) {
        const at = (azimuthDeg: number) =>
          range.bench.scene.s(parameter, 820e6 + 10e6 * k, range.clock.monotonicMs(), {
            azimuthDeg,
            elevationDeg: 0,
            rollDeg: 0,
          });
        const wanted = at(target['azimuth'] ?? 0);
        const off = Math.hypot(trace[2 * k]! - wanted.re, trace[2 * k + 1]! - wanted.im);
        // Noise 90 dB down, and a position within 0.05°: a thousandth of a beam.
        const scale = Math.hypot(at(0).re, at(0).im);
        expect(off / scale, `${parameter} at ${target['azimuth']}°, point ${k + 1}`).toBeLessThan(3e-3);
      }
    }
  }
});
