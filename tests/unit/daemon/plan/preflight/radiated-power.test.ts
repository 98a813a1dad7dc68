// By hand: 9 dBm and 11 dBi are 20 dBm, 0.1 W. From 299.8 MHz both public levels are 2 W/m²:
// √(0.1/(4π·2)) = 0.06308 m.
import { describe, expect, it } from 'vitest';
import { checkRadiatedPower } from '../../../../../daemon/plan/preflight/radiated-power.ts';
import { night, site, siteWithout } from './site.ts';

const at = (powerDbm: number) => night({ analyzer: { ifBandwidthHz: 1000, powerDbm, averages: 1 } });
const autOn2 = { ...site().analyzer, autPort: 2 as const };

describe('the radiated power', () => {
  it('is that of the antenna on the driven port, against the lower public level', () => {
    const { verdict, facts, text } = checkRadiatedPower(at(9), site());
    expect(verdict).toBe('go');
    expect(facts['eirpW']).toBeCloseTo(0.1, 9);
    expect(facts['limitWM2']).toBe(2);
    expect(facts['distanceM']).toBeCloseTo(0.06308, 5);
    expect(text).toContain('local limits and licences go first');
    // 868 MHz: ICNIRP has 4.34, 47 CFR 5.79 W/m².
    const higher = checkRadiatedPower(
      { ...at(9), band: { startHz: 868e6, stopHz: 870e6, points: 3 } },
      site(),
    );
    expect(higher.facts['limitWM2']).toBeCloseTo(4.34, 9);
  });

  it('asks for distance, twice the free-space one, where it is more than an arm long', () => {
    // 24 dB more: 25.12 W, 0.99976 m.
    expect(checkRadiatedPower(at(33), site())).toMatchObject({
      verdict: 'caution',
      change: 'keep everybody 2 m from the beam, or lower the power',
    });
  });

  it('counts the stronger of both antennas where both ports are driven', () => {
    const strong = site({ analyzer: autOn2, rangeAntennaGainDbi: 21 });
    expect(checkRadiatedPower(at(9), strong).facts['eirpW']).toBeCloseTo(1, 9);
    const weak = site({ analyzer: autOn2, rangeAntennaGainDbi: -3 });
    expect(checkRadiatedPower(at(9), weak).facts['eirpW']).toBeCloseTo(0.1, 9);
  });

  it('takes the limit of the range file, and asks for one where none is known', () => {
    expect(checkRadiatedPower(at(9), site({ cautionLimitWM2: 0.02 })).facts['distanceM']).toBeCloseTo(
      0.6308,
      4,
    );
    const short = { ...at(9), band: { startHz: 10e6, stopHz: 20e6, points: 3 } };
    expect(checkRadiatedPower(short, site()).text).toBe('give cautionLimit in the range file');
    expect(checkRadiatedPower(short, site({ cautionLimitWM2: 2 })).verdict).toBe('go');
  });

  it('judges nothing without the gains', () => {
    const unknown = { ...siteWithout('rangeAntennaGainDbi'), analyzer: autOn2 };
    expect(checkRadiatedPower({ ...at(9), expected: {} }, unknown)).toMatchObject({
      verdict: 'not-checked',
      text: 'give antennas.rangeAntennaGain in the range file, antenna.expectedGain in the plan',
    });
  });
});
