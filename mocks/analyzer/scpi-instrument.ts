// A simulated two-port network analyzer that speaks SCPI in one of several command trees. The wire is a visitor's
// link, time is the clock's, and what it measures is handed in; see faults.ts for how to make it misbehave.
import type { Clock } from '../../drivers/clock.ts';
import type { Link } from '../../drivers/link/link.ts';
import { type Answer, type Command, CommandTree } from './command-tree.ts';
import { namedMeasurementCommands } from './command-trees/named-measurement.ts';
import { numberedParameterCommands } from './command-trees/numbered-parameter.ts';
import { selectedTraceCommands } from './command-trees/selected-trace.ts';
import { commonCommands } from './commands-common.ts';
import { stimulusCommands } from './commands-stimulus.ts';
import { formatCommands } from './commands-traces.ts';
import { Refusal } from './error-queue.ts';
import type { InstrumentFaults } from './faults.ts';
import { InstrumentState } from './instrument-state.ts';
import type { Measure } from './measurement.ts';
import { MessageInput } from './message-input.ts';
import { parseUnit, splitUnits, type Unit } from './message-units.ts';
import { latin1, Session } from './session.ts';
import { presetSettings, type Settings } from './settings.ts';
import { SweepRunner, type SweepTiming } from './sweep-runner.ts';

export interface ScpiInstrumentOptions {
  clock: Clock;
  measure: Measure;
  /** Maker, model, serial, firmware; the default is an invention. */
  identity?: readonly [string, string, string, string];
  /** Default CR LF. */
  lineEnd?: string;
  /** Sent to every visitor when it is served. */
  greeting?: string;
  /** `one`: later visitors connect and are not served until the first has gone. */
  sessions?: 'one' | 'several';
  /** Time of a point; default 1/IF bandwidth + 20 µs. */
  timing?: SweepTiming;
  /** A calibration is there and in force after every reset; default true. */
  calibrated?: boolean;
  /** How traces are defined and chosen, and sweeps started; default `numbered-parameter`. */
  commandTree?: keyof typeof commandTrees;
}

const commandTrees = {
  'numbered-parameter': numberedParameterCommands,
  'named-measurement': namedMeasurementCommands,
  'selected-trace': selectedTraceCommands,
};

const defaultIdentity = ['NIGHTCUT', 'BENCH-2PORT', 'SIM-0001', '1.0'] as const;

export class ScpiInstrument {
  /** May be changed at any moment. */
  faults: InstrumentFaults = {};
  readonly #clock: Clock;
  readonly #options: ScpiInstrumentOptions;
  readonly #state: InstrumentState;
  readonly #tree: CommandTree;
  readonly #sessions: Session[] = [];
  /** With one session at a time all visitors share it: a half line outlives its writer. */
  readonly #input = new MessageInput();
  #bootingUntilMs = Number.NEGATIVE_INFINITY;

  constructor(options: ScpiInstrumentOptions) {
    this.#clock = options.clock;
    this.#options = options;
    const calibrated = options.calibrated ?? true;
    const settings = presetSettings(calibrated);
    const timing = options.timing ?? { filterFactor: 1, settleMs: 0.02 };
    const runner = new SweepRunner(options.clock, options.measure, timing, () => this.faults, settings);
    const identity = (options.identity ?? defaultIdentity).join(',');
    this.#state = new InstrumentState(identity, calibrated, settings, runner);
    this.#state.status.powerOn();
    const commandTree = options.commandTree ?? 'numbered-parameter';
    this.#tree = new CommandTree([
      ...commonCommands(this.#state),
      ...stimulusCommands(this.#state, commandTree !== 'selected-trace'),
      ...commandTrees[commandTree](this.#state),
      ...formatCommands(this.#state),
    ]);
  }

  /** What is set now, for tests and checkers (is the source off?). */
  get settings(): Settings {
    return this.#state.settings;
  }

  get isSweeping(): boolean {
    return this.#state.runner.isSweeping;
  }

  /** Takes in a visitor whose link is open; for `listenTcp` and `MemoryPort.listen`. */
  accept(visitor: Link): void {
    const several = this.#options.sessions === 'several';
    const session = new Session(visitor, {
      clock: this.#clock,
      input: several ? new MessageInput() : this.#input,
      lineEnd: this.#lineEnd,
      faults: () => this.faults,
      execute: (message) => this.#execute(message),
      raise: (number) => this.#state.raise(number),
      onClosed: (gone) => this.#leave(gone),
    });
    this.#sessions.push(session);
    if (this.#clock.monotonicMs() < this.#bootingUntilMs) void session.drop();
    else if (several || this.#sessions.length === 1) session.serve(this.#options.greeting);
  }

  /** Puts an error into the queue, as trouble inside the instrument would. */
  raiseError(number: number, remark?: string): void {
    this.#state.raise(number, remark);
  }

  /** Power goes and comes: links are cut, settings and queues are as new, visitors refused for `bootMs`. */
  async powerCycle(bootMs = 0): Promise<void> {
    this.#bootingUntilMs = this.#clock.monotonicMs() + bootMs;
    this.#state.reset();
    this.#state.errors.clear();
    this.#state.status.powerOn();
    this.#input.clear();
    await Promise.all(this.#sessions.splice(0).map((session) => session.drop()));
    this.#input.clear();
  }

  get #lineEnd(): string {
    return this.#options.lineEnd ?? '\r\n';
  }

  #leave(session: Session): void {
    const place = this.#sessions.indexOf(session);
    if (place >= 0) this.#sessions.splice(place, 1);
    const next = this.#sessions[0];
    if (next && !next.isServed && this.#clock.monotonicMs() >= this.#bootingUntilMs) {
      next.serve(this.#options.greeting);
    }
  }

  /** Runs the units in order; a refused one is queued as an error and leaves no trace in the answer. */
  async #execute(received: string): Promise<Uint8Array | undefined> {
    const message = this.#withoutControls(received);
    const answers: Answer[] = [];
    let path: readonly string[] = [];
    for (const text of this.#attempt(() => splitUnits(message)) ?? []) {
      const unit = this.#attempt(() => parseUnit(text));
      const found = unit && this.#attempt(() => this.#tree.find(unit, path));
      if (!unit || !found) continue;
      path = found.path;
      try {
        const answer = await this.#run(found.command, unit, found.suffixes);
        if (answer !== undefined) answers.push(answer);
      } catch (error) {
        this.#queueRefusal(error);
      }
    }
    return answers.length === 0 ? undefined : this.#joined(answers);
  }

  #withoutControls(message: string): string {
    const clean = message.replace(/[^\t\x20-\x7e]/g, '');
    if (clean !== message) this.#state.raise(-101);
    return clean;
  }

  async #run(command: Command, unit: Unit, suffixes: readonly number[]): Promise<Answer | undefined> {
    const [least, most] = (unit.query ? command.asks : command.takes) ?? [0, 0];
    if (unit.parameters.length < least) throw new Refusal(-109);
    if (unit.parameters.length > most) throw new Refusal(-108);
    const call = { parameters: unit.parameters, suffixes };
    if (unit.query) return command.query?.(call);
    await command.set?.(call);
    return undefined;
  }

  #attempt<T>(act: () => T): T | undefined {
    try {
      return act();
    } catch (error) {
      this.#queueRefusal(error);
      return undefined;
    }
  }

  /** Anything else than a refusal is a defect of this simulator and must not pass for one. */
  #queueRefusal(error: unknown): void {
    if (!(error instanceof Refusal)) throw error;
    this.#state.raise(error.number, error.remark);
  }

  #joined(answers: readonly Answer[]): Uint8Array {
    const parts = answers.flatMap((answer, i) => [latin1(i === 0 ? '' : ';'), bytesOf(answer)]);
    parts.push(latin1(this.#lineEnd));
    const out = new Uint8Array(parts.reduce((sum, part) => sum + part.length, 0));
    let at = 0;
    for (const part of parts) {
      out.set(part, at);
      at += part.length;
    }
    return out;
  }
}

function bytesOf(answer: Answer): Uint8Array {
  return typeof answer === 'string' ? latin1(answer) : answer;
}
