// The shape of a plan field by field; what fields demand of each other is in parse-plan.ts.
import { z } from 'zod';
import { axisName, choice, keys, type Limits, list, name, quantity, refuse, wholeNumber } from './fields.ts';

const frequency: Limits = { above: 0, to: 1e12, says: 'above 0 Hz and up to 1000 GHz' };
const patternAngle: Limits = { from: -360, to: 360, says: 'from -360 to 360 deg' };

/** A cut of a full turn in steps of 0.01 deg has as many samples, and one more. */
export const mostSteps = 36_000;

const cut = keys({
  name: name('the name of the cut', 60),
  axis: axisName(),
  plane: choice(['E', 'H', 'other']),
  from: quantity('angle', patternAngle),
  to: quantity('angle', patternAngle),
  step: quantity('angle', { above: 0, to: 360, says: 'above 0 and up to 360 deg' }),
  at: z
    .record(axisName(), quantity('angle', patternAngle), {
      error: 'a mapping of the other axes to angles, such as { elevation: 0 deg }',
    })
    .prefault({}),
  autRoll: quantity('angle', patternAngle).prefault('0 deg'),
  component: choice(['co', 'cross']).prefault('co'),
});

const tolerated: Limits = { above: 0, to: 60, says: 'above 0 and up to 60 dB' };

export const planSchema = keys({
  antenna: keys({
    name: name('the name of the antenna'),
    revision: name('a revision', 40),
    size: quantity('length', { above: 0, to: 100, says: 'above 0 m and up to 100 m' }).optional(),
    expectedGain: quantity('gain', { from: -60, to: 60, says: 'from -60 to 60 dBi' }).optional(),
  }),
  kind: choice(['pattern', 'reference']),
  band: keys({
    from: quantity('frequency', frequency),
    to: quantity('frequency', frequency),
    points: wholeNumber(2, 20_001),
  }),
  markers: list(quantity('frequency', frequency), 'a list of frequencies such as [868 MHz]').prefault([]),
  analyzer: keys({
    ifBandwidth: quantity('frequency', { above: 0, to: 1e8, says: 'above 0 Hz and up to 100 MHz' }),
    power: quantity('power', { from: -120, to: 30, says: 'from -120 to 30 dBm' }),
    averages: wholeNumber(1, 10_000).prefault('1'),
  }),
  gainReference: gainReference().optional(),
  cuts: list(cut, 'a list of cuts').prefault([]),
  ties: keys({ every: wholeNumber(1, 100_000).prefault('60') }).prefault({}),
  checks: keys({
    closure: quantity('ratio', tolerated).prefault('0.2 dB'),
    drift: quantity('ratio', tolerated).prefault('0.5 dB'),
  }).prefault({}),
}).meta({ title: 'Nightcut plan' });

export type PlanText = z.output<typeof planSchema>;

function gainReference() {
  const expectation = 'latest, none or the number of a reference run';
  return z
    .string({ error: expectation })
    .transform((text, context): 'latest' | 'none' | number => {
      if (text === 'latest' || text === 'none') return text;
      if (/^[1-9]\d{0,8}$/.test(text)) return Number(text);
      refuse(context, expectation);
      return z.NEVER;
    })
    .meta({ type: ['string', 'integer'], description: expectation });
}
