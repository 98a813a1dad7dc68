// The text of a range file to a RangeFile, checked field by field and between fields. Opens no device; whether
// the things described answer is the bench's business.
import { dirname, resolve } from 'node:path';
import { checkText, type Finding } from './check-tree.ts';
import { isSameDevice } from './link-address.ts';
import type { RangeAxis, RangeFile, ReferenceAntenna } from './range-file.ts';
import { type RangeText, rangeSchema } from './range-schema.ts';
import { checkDialect, dialectOf } from './read-dialect.ts';

/** `path` as the operator wrote it, for messages and relative paths. Throws FILE_INVALID. */
export function parseRangeFile(text: string, path: string): RangeFile {
  const written = checkText(text, path, rangeSchema, checkRange);
  const { heights, positioner, antennas } = written;
  const absolute = resolve(path);
  return {
    path: absolute,
    text,
    name: written.range,
    rangeLengthM: written.rangeLength,
    ...(heights ? { heights: { rangeAntennaM: heights.rangeAntenna, autM: heights.aut } } : {}),
    ...given('nearestWallM', written.nearestWall),
    ...given('autOffsetM', written.autOffset),
    ...given('cableLossDb', written.cableLoss),
    ...given('cautionLimitWM2', written.cautionLimit),
    analyzer: analyzerOf(written.analyzer),
    positioner: { link: positioner.link, family: positioner.family, axes: axesOf(written) },
    rangeAntenna: antennas.rangeAntenna,
    ...given('rangeAntennaSizeM', antennas.rangeAntennaSize),
    ...given('rangeAntennaGainDbi', antennas.rangeAntennaGain),
    ...(antennas.reference ? { reference: referenceOf(antennas.reference) } : {}),
    archive: resolve(dirname(absolute), written.archive),
  };
}

function analyzerOf({ noiseFloor, ...written }: RangeText['analyzer']): RangeFile['analyzer'] {
  return {
    ...written,
    dialect: dialectOf(written.dialect),
    autPort: written.autPort === 1 ? 1 : 2,
    ...(noiseFloor
      ? { noiseFloor: { levelDbm: noiseFloor.level, ifBandwidthHz: noiseFloor.ifBandwidth } }
      : {}),
  };
}

function axesOf(written: RangeText): RangeAxis[] {
  return Object.entries(written.positioner.axes).map(([name, axis]) => ({
    name,
    word: axis.word,
    unitsPerDegree: axis.unitsPerDegree,
    travelMinDeg: axis.travel.min,
    travelMaxDeg: axis.travel.max,
    rateDegPerS: axis.rate,
    accelerationDegPerS2: axis.acceleration,
    approachFrom: axis.approach.from,
    approachDeg: axis.approach.by,
    settleMs: axis.settle,
    toleranceDeg: axis.tolerance,
    homing: axis.homing,
    sense: axis.sense,
    boresightDeg: axis.boresight,
  }));
}

function referenceOf(written: NonNullable<RangeText['antennas']['reference']>): ReferenceAntenna {
  const { stated, uncertainty, table } = written.gain;
  return {
    name: written.name,
    stated,
    table: table.map(({ at, gain }) => ({ frequencyHz: at, gainDbi: gain })),
    ...given('uncertaintyDb', uncertainty),
    ...given('sizeM', written.size),
  };
}

/** A key only where a value was written. */
function given<Key extends string>(key: Key, value: number | undefined): { [K in Key]?: number } {
  return value === undefined ? {} : ({ [key]: value } as { [K in Key]: number });
}

function checkRange(written: RangeText): Finding[] {
  const { analyzer, positioner, antennas } = written;
  const findings = checkDialect(analyzer.dialect, ['analyzer', 'dialect']);
  const axes = Object.entries(positioner.axes);
  if (axes.length === 0) {
    findings.push({ path: ['positioner', 'axes'], expectation: 'at least one axis, such as azimuth' });
  }
  if (isSameDevice(analyzer.link, positioner.link)) {
    findings.push({ path: ['positioner', 'link'], expectation: 'another address than analyzer.link' });
  }
  const owners = new Map<string, string>();
  for (const [name, axis] of axes) {
    findings.push(...checkAxis(['positioner', 'axes', name], axis));
    const owner = owners.get(axis.word);
    if (owner === undefined) owners.set(axis.word, name);
    else {
      const path = ['positioner', 'axes', name, 'word'];
      findings.push({ path, expectation: `another letter than that of axis ${owner}` });
    }
  }
  return [...findings, ...checkTable(antennas.reference?.gain.table ?? [])];
}

type AxisText = RangeText['positioner']['axes'][string];

/** Travel, and boresight with its approach inside it: every run goes to boresight. */
function checkAxis(path: string[], axis: AxisText): Finding[] {
  const { min, max } = axis.travel;
  const findings: Finding[] = [];
  if (axis.unitsPerDegree === 0) {
    findings.push({ path: [...path, 'unitsPerDegree'], expectation: 'a number other than 0' });
  }
  if (min >= max) {
    return [
      ...findings,
      { path: [...path, 'travel', 'max'], expectation: `an angle above travel.min, ${min} deg` },
    ];
  }
  if (axis.boresight < min || axis.boresight > max) {
    const expectation = `an angle within travel, ${min} deg to ${max} deg`;
    return [...findings, { path: [...path, 'boresight'], expectation }];
  }
  const room = axis.approach.from === 'below' ? axis.boresight - min : max - axis.boresight;
  if (axis.approach.by > room) {
    const expectation = `at most the ${room} deg of travel ${axis.approach.from} boresight`;
    findings.push({ path: [...path, 'approach', 'by'], expectation });
  }
  return findings;
}

function checkTable(table: readonly { at: number }[]): Finding[] {
  return table.flatMap((row, i) => {
    const before = table[i - 1];
    if (before === undefined || row.at > before.at) return [];
    const path = ['antennas', 'reference', 'gain', 'table', i, 'at'];
    return [{ path, expectation: 'frequencies in ascending order, none twice' }];
  });
}
