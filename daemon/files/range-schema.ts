// The shape of a range file field by field; what fields demand of each other is in parse-range-file.ts.
import { z } from 'zod';
import { dialectSchema } from './dialect-schema.ts';
import {
  axisName,
  choice,
  keys,
  type Limits,
  list,
  name,
  quantity,
  refuse,
  unitsPerDegree,
  wholeNumber,
} from './fields.ts';
import { linkExpectation, parseLink } from './link-address.ts';
import type { LinkAddress } from './range-file.ts';

const link = z
  .string({ error: linkExpectation })
  .transform((text, context): LinkAddress => {
    const parsed = parseLink(text);
    if (parsed.kind === 'link') return parsed.link;
    refuse(context, linkExpectation, parsed.advice);
    return z.NEVER;
  })
  .meta({ pattern: '^(tcp|serial)://', description: linkExpectation });

const travelAngle: Limits = { from: -3600, to: 3600, says: 'within ten turns' };
const antennaSize: Limits = { above: 0, to: 100, says: 'above 0 m and up to 100 m' };
const antennaGain: Limits = { from: -60, to: 60, says: 'from -60 to 60 dBi' };
const height: Limits = { above: 0, to: 1000, says: 'above 0 m and up to 1 km' };

const axis = keys({
  word: choice(['X', 'Y', 'Z', 'A', 'B', 'C', 'U', 'V', 'W']),
  unitsPerDegree: unitsPerDegree(),
  travel: keys({ min: quantity('angle', travelAngle), max: quantity('angle', travelAngle) }),
  rate: quantity('rate', { above: 0, to: 720, says: 'above 0 and up to 720 deg/s' }),
  acceleration: quantity('acceleration', { above: 0, to: 7200, says: 'above 0 and up to 7200 deg/s2' }),
  approach: keys({
    from: choice(['below', 'above']),
    by: quantity('angle', { from: 0, to: 90, says: 'from 0 to 90 deg' }),
  }),
  settle: quantity('duration', { from: 0, to: 600_000, says: 'from 0 to 10 min' }),
  tolerance: quantity('angle', { above: 0, to: 5, says: 'above 0 and up to 5 deg' }),
  homing: choice(['switch', 'none']),
  sense: sense(),
  boresight: quantity('angle', travelAngle).prefault('0 deg'),
});

const trace = keys({
  format: choice(['real64', 'real32', 'ascii']).prefault('real64'),
  byteOrder: choice(['normal', 'swapped']).prefault('normal'),
});

const reference = keys({
  name: name('the name of the reference antenna'),
  size: quantity('length', antennaSize).optional(),
  gain: keys({
    stated: choice(['ieee', 'realized']),
    uncertainty: quantity('ratio', { from: 0, to: 10, says: 'from 0 to 10 dB' }).optional(),
    table: list(
      keys({
        at: quantity('frequency', { above: 0, says: 'above 0 Hz' }),
        gain: quantity('gain', antennaGain),
      }),
      'a list of frequencies and gains such as { at: 868 MHz, gain: 2.1 dBi }',
      1,
    ),
  }),
});

/** Mean noise of the receiver without a signal, in the IF bandwidth it was read with. */
const noiseFloor = keys({
  level: quantity('power', { from: -200, to: 0, says: 'from -200 to 0 dBm' }),
  ifBandwidth: quantity('frequency', { above: 0, to: 1e8, says: 'above 0 Hz and up to 100 MHz' }),
});

export const rangeSchema = keys({
  range: name('the name of the range', 40),
  rangeLength: quantity('length', { above: 0, to: 100_000, says: 'above 0 m and up to 100 km' }),
  heights: keys({ rangeAntenna: quantity('length', height), aut: quantity('length', height) }).optional(),
  nearestWall: quantity('length', { above: 0, to: 10_000, says: 'above 0 m and up to 10 km' }).optional(),
  autOffset: quantity('length', { from: 0, to: 100, says: 'from 0 m to 100 m' }).optional(),
  cableLoss: quantity('ratio', { from: 0, to: 100, says: 'from 0 to 100 dB' }).optional(),
  cautionLimit: quantity('power density', {
    above: 0,
    to: 1000,
    says: 'above 0 and up to 1000 W/m2',
  }).optional(),
  analyzer: keys({
    link,
    dialect: dialectSchema,
    autPort: wholeNumber(1, 2),
    trace: trace.prefault({}),
    noiseFloor: noiseFloor.optional(),
  }),
  positioner: keys({
    link,
    family: choice(['realtime-status', 'position-report']),
    axes: z
      .record(axisName(), axis, { error: 'a mapping of axes by name, such as azimuth' })
      .meta({ minProperties: 1 }),
  }),
  antennas: keys({
    rangeAntenna: name('the name of the range antenna'),
    rangeAntennaSize: quantity('length', antennaSize).optional(),
    rangeAntennaGain: quantity('gain', antennaGain).optional(),
    reference: reference.optional(),
  }),
  archive: name('the path of the archive file', 1000).prefault('nightcut.sqlite'),
}).meta({ title: 'Nightcut range file' });

export type RangeText = z.output<typeof rangeSchema>;

/** Which way pattern angles count; written +1 or -1. */
function sense() {
  const expectation = '+1 or -1';
  return z
    .string({ error: expectation })
    .transform((text, context): 1 | -1 => {
      if (text === '+1' || text === '1') return 1;
      if (text === '-1') return -1;
      refuse(context, expectation);
      return z.NEVER;
    })
    .meta({ type: 'integer', enum: [1, -1] });
}
