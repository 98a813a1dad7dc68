// The line between angle brackets: what stands in it, in which order, and the slow fields that come round
// only now and then.
import { axisLetters } from './traits.ts';

export interface ReportFacts {
  state: string;
  position: readonly number[];
  offset: readonly number[];
  feed: number;
  freeBlocks: number;
  freeBytes: number;
  closedSwitches: readonly number[];
  doorOpen: boolean;
  overrides: readonly [feed: number, rapid: number, spindle: number];
  /** Of settings 10 and 13. */
  mask: number;
  inches: boolean;
  /** Motion is going on: the slow fields then come round more rarely. */
  busy: boolean;
}

const offsetEvery = { idle: 10, busy: 30 };
const overridesEvery = { idle: 10, busy: 20 };

export class StatusReporter {
  readonly #extended: boolean;
  #offsetIn = 0;
  #overridesIn = 0;

  constructor(extended: boolean) {
    this.#extended = extended;
  }

  /** The extended edition begins with the overrides after a reset, the classic one with the offset. */
  reset(): void {
    this.#offsetIn = this.#extended ? 1 : 0;
    this.#overridesIn = 0;
  }

  offsetChanged(): void {
    this.#offsetIn = 0;
  }

  overridesChanged(): void {
    this.#overridesIn = 0;
  }

  render(facts: ReportFacts): string {
    const fields = [facts.state, this.#place(facts)];
    if (this.#extended || facts.mask & 2) fields.push(`Bf:${facts.freeBlocks},${facts.freeBytes}`);
    fields.push(`FS:${facts.feed.toFixed(0)},0`);
    const pins = facts.closedSwitches.map((axis) => axisLetters[axis]).join('') + (facts.doorOpen ? 'D' : '');
    if (pins) fields.push(`Pn:${pins}`);
    fields.push(...this.#slowFields(facts));
    return `<${fields.join('|')}>`;
  }

  /** Everything at once, as the extended edition answers 0x87. */
  renderFull(facts: ReportFacts, system: string, intervalMs: number): string {
    const fields = [facts.state, this.#place(facts), `Bf:${facts.freeBlocks},${facts.freeBytes}`];
    fields.push(
      `FS:${facts.feed.toFixed(0)},0`,
      `WCO:${places(facts.offset, facts.inches)}`,
      `WCS:${system}`,
    );
    fields.push(`Ov:${facts.overrides.join(',')}`, 'A:', 'Sc:');
    if (intervalMs > 0) fields.push(`AR:${intervalMs}`);
    fields.push('MPG:0', 'H:0', 'T:0', 'P:0', 'TLR:0', 'FW:grblHAL');
    return `<${fields.join('|')}>`;
  }

  #place(facts: ReportFacts): string {
    if (facts.mask & 1) return `MPos:${places(facts.position, facts.inches)}`;
    const work = facts.position.map((value, axis) => value - facts.offset[axis]!);
    return `WPos:${places(work, facts.inches)}`;
  }

  #slowFields(facts: ReportFacts): string[] {
    const pace = facts.busy ? 'busy' : 'idle';
    const fields: string[] = [];
    if (this.#offsetIn > 0) this.#offsetIn -= 1;
    else {
      this.#offsetIn = offsetEvery[pace] - 1;
      if (this.#overridesIn === 0) this.#overridesIn = 1;
      fields.push(`WCO:${places(facts.offset, facts.inches)}`);
    }
    if (this.#overridesIn > 0) this.#overridesIn -= 1;
    else {
      this.#overridesIn = overridesEvery[pace] - 1;
      fields.push(`Ov:${facts.overrides.join(',')}`);
      if (this.#extended) fields.push('A:');
    }
    return fields;
  }
}

/** The device counts in single precision; the last printed digit shows it. */
function places(values: readonly number[], inches: boolean): string {
  return values
    .map((value) => (inches ? Math.fround(value / 25.4).toFixed(4) : Math.fround(value).toFixed(3)))
    .join(',');
}
