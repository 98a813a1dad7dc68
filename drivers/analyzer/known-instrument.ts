// Who answered when the session was opened, compared each time it is opened anew; and whether the
// instrument was switched off meanwhile, kept until somebody has been told.
import { DriverError } from '../errors.ts';
import type { AnalyzerIdentity } from './analyzer.ts';

export class KnownInstrument {
  #identity: AnalyzerIdentity | undefined;
  #powerCycled = false;

  /**
   * `powerOn`: the event register says that it was switched on since it was last read; at the first
   * meeting that is no news. Throws ANALYZER_IDENTITY_CHANGED. Firmware may differ: an update is no other
   * instrument.
   */
  meet(identity: AnalyzerIdentity, powerOn: boolean): void {
    const before = this.#identity;
    this.#identity ??= identity;
    if (!before) return;
    if (powerOn) this.#powerCycled = true;
    for (const field of ['maker', 'model', 'serial'] as const) {
      if (before[field] === identity[field]) continue;
      throw new DriverError(
        'ANALYZER_IDENTITY_CHANGED',
        `another instrument answers: ${field} was '${before[field]}' and is '${identity[field]}'`,
        { field, before: before[field], now: identity[field] },
      );
    }
  }

  /** Throws ANALYZER_POWER_CYCLED once after each power cycle. */
  tellOfPowerCycle(cause?: unknown): void {
    if (!this.#powerCycled) return;
    this.#powerCycled = false;
    throw new DriverError('ANALYZER_POWER_CYCLED', 'the instrument was switched off and on', {}, cause);
  }

  /** Everything is set anew by one who sees what there is. */
  forgetPowerCycle(): void {
    this.#powerCycled = false;
  }
}
