// A plain visitor of the simulated instrument for its tests: text out, bytes in, nothing clever.

import type { Link } from '../../../../drivers/link/link.ts';
import { MemoryPort } from '../../../../drivers/link/memory.ts';
import type { Measure, SweepPass } from '../../../../mocks/analyzer/measurement.ts';
import { ScpiInstrument, type ScpiInstrumentOptions } from '../../../../mocks/analyzer/scpi-instrument.ts';
import { SimulatedClock } from '../../../../mocks/simulated-clock.ts';

export class Visitor {
  readonly link: Link;
  readonly #clock: SimulatedClock;
  #received: Uint8Array[] = [];

  constructor(link: Link, clock: SimulatedClock) {
    this.link = link;
    this.#clock = clock;
    link.received$.subscribe((bytes) => {
      this.#received.push(bytes);
    });
  }

  async send(text: string): Promise<void> {
    await this.link.write(Uint8Array.from(text, (c) => c.charCodeAt(0)));
  }

  /** All that came by now, one character per byte. */
  taken(): string {
    const text = Buffer.concat(this.#received).toString('latin1');
    this.#received = [];
    return text;
  }

  async waitMs(ms: number): Promise<string> {
    await this.#clock.run(this.#clock.sleep(ms));
    return this.taken();
  }

  /** Sends a line and returns what came within 10 ms. */
  async ask(text: string, withinMs = 10): Promise<string> {
    await this.send(`${text}\n`);
    return this.waitMs(withinMs);
  }
}

/** A world whose data tell who measured them: re = point index, im = the parameter's digits. */
export const telling: Measure = (pass) =>
  new Map(
    pass.parameters.map((name) => {
      const trace = new Float64Array(2 * pass.frequenciesHz.length);
      for (let i = 0; i < pass.frequenciesHz.length; i++) trace.set([i, Number(name.slice(1))], 2 * i);
      return [name, trace];
    }),
  );

export async function bench(options: Partial<ScpiInstrumentOptions> = {}) {
  const clock = new SimulatedClock();
  const passes: SweepPass[] = [];
  const measure: Measure = (pass) => {
    passes.push(pass);
    return (options.measure ?? telling)(pass);
  };
  const instrument = new ScpiInstrument({ clock, ...options, measure });
  const port = new MemoryPort(clock, 'memory://analyzer');
  port.listen((visitor) => instrument.accept(visitor));
  const visit = async (): Promise<Visitor> => {
    const visitor = new Visitor(port.link(), clock);
    await visitor.link.open();
    return visitor;
  };
  return { clock, instrument, port, passes, visit, visitor: await visit() };
}
