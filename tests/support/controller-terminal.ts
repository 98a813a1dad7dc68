// A bare terminal on the simulated controller, in virtual time: writes bytes at stated moments and notes each
// line with the time it came. Splits lines itself, sharing nothing with the drivers.
import { MemoryPort } from '../../drivers/link/memory.ts';
import { type ControllerOptions, RealtimeStatusController } from '../../mocks/positioner/controller.ts';
import { SimulatedClock } from '../../mocks/simulated-clock.ts';

export interface Heard {
  atMs: number;
  text: string;
}

export class ControllerTerminal {
  readonly clock = new SimulatedClock();
  readonly port = new MemoryPort(this.clock);
  readonly controller: RealtimeStatusController;
  readonly heard: Heard[] = [];
  link = this.port.link();
  #partial = '';

  constructor(options: ControllerOptions = {}) {
    this.controller = new RealtimeStatusController(this.clock, options);
    this.port.listen((visitor) => this.controller.connect(visitor));
  }

  /** Opens the link and waits until the device is up. */
  async open(settleMs = 100): Promise<void> {
    this.link = this.port.link();
    this.link.received$.subscribe((bytes) => {
      for (const byte of bytes) {
        if (byte !== 0x0a) this.#partial += String.fromCharCode(byte);
        else {
          this.heard.push({ atMs: this.clock.monotonicMs(), text: this.#partial.replace(/\r$/, '') });
          this.#partial = '';
        }
      }
    });
    await this.link.open();
    await this.wait(settleMs);
  }

  wait(ms: number): Promise<void> {
    return this.clock.run(this.clock.sleep(ms));
  }

  /** Writes text or single bytes as they are. */
  async write(text: string | number): Promise<void> {
    const bytes = typeof text === 'number' ? Uint8Array.of(text) : Buffer.from(text, 'latin1');
    await this.link.write(bytes);
  }

  /** Writes a line and returns what came up to its `ok` or `error`, that included. */
  async ask(line: string, withinMs = 600_000): Promise<string[]> {
    const from = this.heard.length;
    await this.write(`${line}\n`);
    const isAnswer = (text: string): boolean => text === 'ok' || text.startsWith('error:');
    await this.until(() => this.heard.slice(from).some((heard) => isAnswer(heard.text)), withinMs);
    return this.heard.slice(from).map((heard) => heard.text);
  }

  /** One status report. */
  async status(): Promise<string> {
    const from = this.heard.length;
    await this.write('?');
    await this.until(() => this.heard.slice(from).some((heard) => heard.text.startsWith('<')), 1_000);
    return this.heard.slice(from).find((heard) => heard.text.startsWith('<'))!.text;
  }

  /** What comes during a stretch of time. */
  async listen(ms: number): Promise<string[]> {
    const from = this.heard.length;
    await this.wait(ms);
    return this.heard.slice(from).map((heard) => heard.text);
  }

  async until(isReached: () => boolean, withinMs: number): Promise<void> {
    const deadlineMs = this.clock.monotonicMs() + withinMs;
    while (!isReached()) {
      if (this.clock.monotonicMs() >= deadlineMs) throw new Error(`nothing within ${withinMs} ms`);
      await this.wait(0.5);
    }
  }

  get lastAtMs(): number {
    return this.heard.at(-1)!.atMs;
  }
}
