// By hand: 8 m at λ = 0.5 m lose 20 log(4π·16) = 46.067 dB. −10 dBm + 11 dBi + 9 dBi − 46.067 dB − 3 dB =
// −39.067 dBm, over −110 dBm: 70.933 dB.
import { describe, expect, it } from 'vitest';
import { checkLinkBudget, noiseDbm } from '../../../../../daemon/plan/preflight/link-budget.ts';
import { night, site, siteWithout } from './site.ts';

const settings = (changes: object) => ({
  ifBandwidthHz: 1000,
  powerDbm: -10,
  averages: 1,
  ...changes,
});

describe('the link budget', () => {
  it('is power, gains, free space and cables over the noise', () => {
    const { verdict, facts } = checkLinkBudget(night(), site());
    expect(verdict).toBe('go');
    expect(facts['receivedDbm']).toBeCloseTo(-39.067, 3);
    expect(facts['floorDbm']).toBeCloseTo(-110, 9);
    expect(facts['marginDb']).toBeCloseTo(70.933, 3);
  });

  it('takes the noise to the bandwidth and the averages of the plan', () => {
    const floor = { levelDbm: -110, ifBandwidthHz: 1000 };
    expect(noiseDbm(floor, { ifBandwidthHz: 10_000, averages: 1 })).toBeCloseTo(-100, 9);
    expect(noiseDbm(floor, { ifBandwidthHz: 10, averages: 10 })).toBeCloseTo(-140, 9);
  });

  it('warns below 50 dB and refuses below 20 dB, with what would make up for it', () => {
    // 40 dB less power: 30.933 dB, 19.067 dB short of 50: 10^1.9067 = 80.67 times.
    const low = checkLinkBudget(night({ analyzer: settings({ powerDbm: -50 }) }), site());
    expect(low.verdict).toBe('caution');
    expect(low.change).toBe('gain 19.1 dB: more power, an IF bandwidth of 12.4 Hz, or 81 averages');
    const kept = checkLinkBudget(night({ analyzer: settings({ powerDbm: -50, averages: 81 }) }), site());
    expect(kept.verdict).toBe('go');
    const lost = checkLinkBudget(night({ analyzer: settings({ powerDbm: -61 }) }), site());
    expect(lost.facts['marginDb']).toBeCloseTo(19.933, 3);
    expect(lost.verdict).toBe('no-go');
    const just = checkLinkBudget(night({ analyzer: settings({ powerDbm: -60 }) }), site());
    expect(just.verdict).toBe('caution');
  });

  it('names every input it misses', () => {
    const { verdict, text } = checkLinkBudget(night({ expected: {} }), {
      ...siteWithout('rangeAntennaGainDbi', 'cableLossDb'),
    });
    expect(verdict).toBe('not-checked');
    expect(text).toBe(
      'give antennas.rangeAntennaGain in the range file, antenna.expectedGain in the plan, cableLoss in the range file',
    );
    const { noiseFloor: _, ...analyzer } = site().analyzer;
    expect(checkLinkBudget(night(), site({ analyzer })).text).toBe(
      'give analyzer.noiseFloor in the range file',
    );
  });

  it('takes the gain of the reference from its table in its own run', () => {
    const at = (frequencyHz: number, gainDbi: number) => ({ frequencyHz, gainDbi });
    const reference = { name: 'dipole', stated: 'ieee', table: [at(200e6, 1), at(800e6, 1)] } as const;
    const finding = checkLinkBudget(night({ kind: 'reference', expected: {} }), site({ reference }));
    expect(finding.facts['marginDb']).toBeCloseTo(60.933, 3);
  });
});
