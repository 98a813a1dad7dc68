// The whole simulated bench from one description: scene, analyzer and controller on one clock, reachable over
// TCP or inside the process. The daemon meets it over the wire only; tests may also ask for the truth.
import type { Clock } from '../drivers/clock.ts';
import type { Link, LinkListener } from '../drivers/link/link.ts';
import { MemoryPort, type MemoryPortOptions } from '../drivers/link/memory.ts';
import { listenTcp } from '../drivers/link/tcp.ts';
import { measureScene } from './analyzer/measure-scene.ts';
import { ScpiInstrument, type ScpiInstrumentOptions } from './analyzer/scpi-instrument.ts';
import { FaultInjector } from './faults/fault-injector.ts';
import { InstrumentHooks } from './faults/instrument-hooks.ts';
import { type ControllerOptions, RealtimeStatusController } from './positioner/controller.ts';
import type { SimulatedController } from './positioner/simulated-controller.ts';
import {
  PositionReportController,
  type ReportControllerOptions,
} from './positioner-report/report-controller.ts';
import { stream } from './random.ts';
import { type Mounted, Scene } from './scene/scene.ts';
import type { SceneDescription } from './scene/scene-description.ts';
import { type FrequencyTruth, type MatchTruth, matchTruth, truthAt } from './scene/truth.ts';

/** Without a family it is `realtime-status`. */
export type ControllerDescription =
  | (ControllerOptions & { family?: 'realtime-status' })
  | (ReportControllerOptions & { family: 'position-report' });

export interface BenchDescription {
  /** Its seed also decides the sizes of faults. */
  scene?: SceneDescription;
  analyzer?: Omit<ScpiInstrumentOptions, 'clock' | 'measure'>;
  positioner?: ControllerDescription;
  /** From a power cut of the analyzer until it takes visitors again. */
  analyzerBootMs?: number;
}

export interface BenchTruth {
  mounted: Mounted;
  frequencies: FrequencyTruth[];
  match: MatchTruth;
}

export interface TruthRequest {
  /** Default 868 MHz. */
  frequenciesHz?: readonly number[];
  /** Where the best match is looked for; default 820 MHz to 920 MHz. */
  bandHz?: readonly [startHz: number, stopHz: number];
  /** Default: what is on the mast. */
  which?: Mounted;
}

const usualBootMs = 3000;

export class SimulatedBench {
  readonly scene: Scene;
  readonly instrument: ScpiInstrument;
  readonly controller: SimulatedController;
  readonly faults: FaultInjector;
  readonly #clock: Clock;
  readonly #listeners: LinkListener[] = [];
  readonly #analyzerVisitors = new Set<Link>();

  /** Throws SceneError when the scene makes no sense. */
  constructor(clock: Clock, description: BenchDescription = {}) {
    this.#clock = clock;
    this.scene = new Scene(description.scene, clock.monotonicMs());
    this.controller = controllerOf(clock, description.positioner);
    this.instrument = new ScpiInstrument({
      clock,
      measure: measureScene(this.scene, (ms) => this.controller.poseAt(ms)),
      ...description.analyzer,
    });
    const hooks = new InstrumentHooks(
      () => clock.monotonicMs(),
      () => this.faults.answered('analyzer'),
    );
    this.instrument.faults = hooks;
    this.faults = new FaultInjector(clock, {
      controller: this.controller,
      hooks,
      powerCycleInstrument: () => void this.instrument.powerCycle(description.analyzerBootMs ?? usualBootMs),
      dropInstrumentVisitors: () => void closeAll(this.#analyzerVisitors),
      random: stream(this.scene.description.seed, 'faults'),
    });
  }

  /** Accepts visitors on `host`; port 0 takes any free one. Throws LINK_OPEN_FAILED. */
  async listenTcp(
    host: string,
    ports: { analyzer: number; positioner: number },
  ): Promise<{ analyzer: number; positioner: number }> {
    const analyzer = await listenTcp(host, ports.analyzer, (visitor) => this.#acceptAtAnalyzer(visitor));
    this.#listeners.push(analyzer);
    const positioner = await listenTcp(host, ports.positioner, (visitor) => this.controller.connect(visitor));
    this.#listeners.push(positioner);
    return { analyzer: analyzer.port, positioner: positioner.port };
  }

  /** Accepts visitors inside the process; `link()` of each port gives a link to open. */
  listenInMemory(options: MemoryPortOptions = {}): { analyzer: MemoryPort; positioner: MemoryPort } {
    const analyzer = new MemoryPort(this.#clock, 'memory://analyzer', options);
    const positioner = new MemoryPort(this.#clock, 'memory://positioner', options);
    this.#listeners.push(
      analyzer.listen((visitor) => this.#acceptAtAnalyzer(visitor)),
      positioner.listen((visitor) => this.controller.connect(visitor)),
    );
    return { analyzer, positioner };
  }

  /** Swaps what stands on the mast. */
  mount(what: Mounted): void {
    this.scene.mount(what);
  }

  /** What the antenna really does, free of noise, drift and echoes. */
  truth(request: TruthRequest = {}): BenchTruth {
    const which = request.which ?? this.scene.mounted;
    const [startHz, stopHz] = request.bandHz ?? [820e6, 920e6];
    return {
      mounted: which,
      frequencies: (request.frequenciesHz ?? [868e6]).map((hz) => truthAt(this.scene, hz, which)),
      match: matchTruth(this.scene, startHz, stopHz, which),
    };
  }

  /** Closes every link and accepts no more visitors. */
  async close(): Promise<void> {
    await Promise.all([closeAll(this.#analyzerVisitors), this.controller.dropVisitors()]);
    await Promise.all(this.#listeners.splice(0).map((listener) => listener.close()));
  }

  #acceptAtAnalyzer(visitor: Link): void {
    this.#analyzerVisitors.add(visitor);
    const leaving = visitor.closed$.subscribe(() => {
      this.#analyzerVisitors.delete(visitor);
      leaving.unsubscribe();
    });
    this.instrument.accept(visitor);
  }
}

function controllerOf(clock: Clock, description: ControllerDescription = {}): SimulatedController {
  return description.family === 'position-report'
    ? new PositionReportController(clock, description)
    : new RealtimeStatusController(clock, description);
}

async function closeAll(visitors: ReadonlySet<Link>): Promise<void> {
  await Promise.all([...visitors].map((visitor) => visitor.close()));
}
