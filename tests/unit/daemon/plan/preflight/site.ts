// A range and a plan, in values, about which every check before the night has something to say.
import type { Plan } from '../../../../../daemon/files/plan-file.ts';
import type { RangeFile } from '../../../../../daemon/files/range-file.ts';
import { axis, cut, elevation, plan as plainPlan } from '../planned.ts';

/** λ is exactly 1 m and 0.5 m at these: round numbers for sums by hand. */
export const oneMetreHz = 299_792_458;
export const halfMetreHz = 2 * oneMetreHz;

export function site(changes: Partial<RangeFile> = {}): RangeFile {
  return {
    path: '/site/range.yaml',
    text: '',
    name: 'meadow',
    rangeLengthM: 8,
    heights: { rangeAntennaM: 3, autM: 3 },
    nearestWallM: 3,
    autOffsetM: 0,
    cableLossDb: 3,
    analyzer: {
      link: { kind: 'tcp', host: '127.0.0.1', port: 5025 },
      dialect: 'numbered-parameter',
      autPort: 1,
      trace: { format: 'real64', byteOrder: 'normal' },
      noiseFloor: { levelDbm: -110, ifBandwidthHz: 1000 },
      // No check reads the dialect.
    } as unknown as RangeFile['analyzer'],
    positioner: {
      link: { kind: 'tcp', host: '127.0.0.1', port: 5026 },
      family: 'realtime-status',
      axes: [axis(), elevation()],
    },
    rangeAntenna: 'panel',
    rangeAntennaSizeM: 0.4,
    rangeAntennaGainDbi: 9,
    archive: '/site/nightcut.sqlite',
    ...changes,
  };
}

/** The site without some of what it knows. */
export function siteWithout(...keys: (keyof RangeFile)[]): RangeFile {
  return Object.fromEntries(
    Object.entries(site()).filter(([key]) => !keys.includes(key as keyof RangeFile)),
  ) as unknown as RangeFile;
}

export function night(changes: Partial<Plan> = {}): Plan {
  return plainPlan({
    band: { startHz: oneMetreHz, stopHz: halfMetreHz, points: 101 },
    expected: { sizeM: 0.6, gainDbi: 11 },
    cuts: [cut({ stepDeg: 5 })],
    ...changes,
  });
}
