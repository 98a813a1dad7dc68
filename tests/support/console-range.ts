// A range over real sockets whose analyzer is no SCPI instrument but a console with a command tree of its own,
// described in the range file alone. The bench's time runs ahead; the daemon's is the world's.
import { InThreadArchive } from '../../daemon/archive/in-thread-archive.ts';
import { closeBench, makeBench } from '../../daemon/bench.ts';
import { parsePlan } from '../../daemon/files/parse-plan.ts';
import { parseRangeFile } from '../../daemon/files/parse-range-file.ts';
import type { RangeFile } from '../../daemon/files/range-file.ts';
import { orderRun } from '../../daemon/run/order-run.ts';
import { RunLoop, type RunOutcome } from '../../daemon/run/run-loop.ts';
import { SystemClock } from '../../drivers/clock.ts';
import type { LinkListener } from '../../drivers/link/link.ts';
import { listenTcp } from '../../drivers/link/tcp.ts';
import { AcceleratedClock } from '../../mocks/accelerated-clock.ts';
import { measureScene } from '../../mocks/analyzer/measure-scene.ts';
import { ScanConsole } from '../../mocks/analyzer-private/scan-console.ts';
import type { SceneDescription } from '../../mocks/scene/scene-description.ts';
import { SimulatedBench } from '../../mocks/simulated-bench.ts';

const acceleration = 60;

/** What a range file says of the console; the indentation is that of `analyzer:`. */
export const consoleDialect = `
  dialect:
    base: scan-table
    identity: bench console
    prompt: "ok>"
    sendsLineEnd: cr
    columns: [frequency, re, im]
    source: only-while-scanning
    fixed: { power: -7 dBm }
    templates:
      identityQuery: version
      ifBandwidth: bandwidth {value}
      ifBandwidthQuery: bandwidth
      scanS21: scan {start} {stop} {points} 5
      scanS11: scan {start} {stop} {points} 3`;

export class ConsoleRange {
  readonly clock = new SystemClock();
  readonly bench: SimulatedBench;
  readonly console: ScanConsole;
  readonly archive = InThreadArchive.open(':memory:');
  readonly #fast = new AcceleratedClock(this.clock, acceleration);
  readonly #listeners: LinkListener[] = [];
  range: RangeFile | undefined;

  constructor(scene: SceneDescription) {
    const limits = [0, 1, 2].flatMap((axis): [number, number][] => [
      [110 + axis, 1200],
      [120 + axis, 40],
      [130 + axis, 400],
    ]);
    this.bench = new SimulatedBench(this.#fast, {
      scene,
      positioner: { settings: { ...Object.fromEntries(limits), 22: 0 } },
    });
    this.console = new ScanConsole({
      clock: this.#fast,
      measure: measureScene(this.bench.scene, (ms) => this.bench.controller.poseAt(ms)),
    });
  }

  /** Opens the ports and reads the range file that names them. */
  async open(dialect = consoleDialect): Promise<RangeFile> {
    const ports = await this.bench.listenTcp('127.0.0.1', { analyzer: 0, positioner: 0 });
    const listener = await listenTcp('127.0.0.1', 0, (visitor) => this.console.accept(visitor));
    this.#listeners.push(listener);
    const text = rangeText(dialect, listener.port, ports.positioner);
    this.range = parseRangeFile(text, 'console.yaml');
    return this.range;
  }

  nowMs(): number {
    return this.#fast.monotonicMs();
  }

  async measure(planText: string): Promise<RunOutcome> {
    const range = this.range ?? (await this.open());
    const draft = orderRun(range, parsePlan(planText, 'test.plan.yaml'));
    const order = await draft.complete(this.archive);
    const devices = makeBench(range, this.clock);
    const loop = new RunLoop(devices, this.archive, this.clock, order);
    return loop.execute(new AbortController().signal).finally(() => closeBench(devices));
  }

  async close(): Promise<void> {
    await this.bench.close();
    await this.console.powerCycle();
    for (const listener of this.#listeners) await listener.close();
    await this.archive.close();
  }
}

function rangeText(dialect: string, analyzerPort: number, positionerPort: number): string {
  return `
range: console meadow
rangeLength: 6 m
analyzer:
  link: tcp://127.0.0.1:${analyzerPort}
  autPort: 1${dialect}
positioner:
  link: tcp://127.0.0.1:${positionerPort}
  family: realtime-status
  axes:
    azimuth:
      word: X
      unitsPerDegree: 1
      travel: { min: -200 deg, max: 200 deg }
      rate: 20 deg/s
      acceleration: 40 deg/s2
      approach: { from: below, by: 2 deg }
      settle: 10 ms
      tolerance: 0.05 deg
      homing: none
      sense: +1
antennas:
  rangeAntenna: range antenna
archive: unused.sqlite
`;
}
