// What the console's words work on: a receiver that scans when told to, from port 1 only, and keeps nothing of it.
import type { Clock } from '../../drivers/clock.ts';
import type { Measure, SParameterName } from '../analyzer/measurement.ts';

/** Numbers of the output mask: which columns a scan prints. */
const maskBits = { frequency: 1, S11: 2, S21: 4 } as const;
const mostPoints = 1001;
const lowestHz = 50e3;
const highestHz = 3e9;
const usualBandwidthHz = 4000;
/** Per point: filter time, and this for the synthesizer. */
const settleMs = 0.1;

export class ConsoleState {
  readonly version: string;
  readonly bandwidthsHz = [100, 300, 1000, usualBandwidthHz];
  readonly #clock: Clock;
  readonly #measure: Measure;
  #bandwidthHz = usualBandwidthHz;

  constructor(clock: Clock, measure: Measure, version: string) {
    this.#clock = clock;
    this.#measure = measure;
    this.version = version;
  }

  get bandwidthHz(): number {
    return this.#bandwidthHz;
  }

  /** False when there is no such filter. */
  setBandwidth(hz: number): boolean {
    if (!this.bandwidthsHz.includes(hz)) return false;
    this.#bandwidthHz = hz;
    return true;
  }

  /** As after power has come. */
  reset(): void {
    this.#bandwidthHz = usualBandwidthHz;
  }

  /** One line for each point, when all have been measured. */
  async scan(startHz: number, stopHz: number, points: number, mask: number): Promise<readonly string[]> {
    const isGrid = Number.isInteger(points) && points >= 2 && points <= mostPoints && startHz < stopHz;
    if (!isGrid || startHz < lowestHz || stopHz > highestHz) return ['scan is out of range'];
    const stepHz = (stopHz - startHz) / (points - 1);
    // The synthesizer has steps of 1 Hz.
    const frequenciesHz = Float64Array.from({ length: points }, (_, i) => Math.round(startHz + i * stepHz));
    const parameters = (['S11', 'S21'] as const).filter((name) => (mask & maskBits[name]) !== 0);
    const beginMs = this.#clock.monotonicMs();
    const pointMs = 1000 / this.#bandwidthHz + settleMs;
    const ifBandwidthHz = this.#bandwidthHz;
    await this.#clock.sleep(points * pointMs);
    const traces = this.#measure({
      parameters,
      drivenPort: 1,
      frequenciesHz,
      pointMs: (i) => beginMs + (i + 0.5) * pointMs,
      ifBandwidthHz,
      averages: 1,
      powerDbm: -7,
      sourceOn: true,
      corrected: true,
    });
    return Array.from(frequenciesHz, (hz, i) => rowOf(hz, i, mask, parameters, traces));
  }
}

function rowOf(
  hz: number,
  point: number,
  mask: number,
  parameters: readonly SParameterName[],
  traces: Map<SParameterName, Float64Array>,
): string {
  const row = (mask & maskBits.frequency) !== 0 ? [String(hz)] : [];
  for (const name of parameters) {
    const values = traces.get(name);
    row.push((values?.[2 * point] ?? 0).toFixed(9), (values?.[2 * point + 1] ?? 0).toFixed(9));
  }
  return row.join(' ');
}
