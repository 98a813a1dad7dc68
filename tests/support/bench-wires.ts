// The simulated bench and the wires a driver can meet it over: memory in virtual time, whole or with every
// packet cut, and real sockets with the bench's time running ahead. For contract tests: one body, every wire.
import { ScpiAnalyzer, type ScpiAnalyzerOptions } from '../../drivers/analyzer/scpi-analyzer.ts';
import { dialectNamed } from '../../drivers/analyzer/scpi-dialects.ts';
import { type Clock, SystemClock } from '../../drivers/clock.ts';
import type { Link } from '../../drivers/link/link.ts';
import type { MemoryPortOptions } from '../../drivers/link/memory.ts';
import { TcpLink } from '../../drivers/link/tcp.ts';
import { GcodePositioner } from '../../drivers/positioner/gcode-positioner.ts';
import type { AxisSetup, Positioner } from '../../drivers/positioner/positioner.ts';
import { ReportPositioner } from '../../drivers/positioner/report-positioner.ts';
import { AcceleratedClock } from '../../mocks/accelerated-clock.ts';
import { stream } from '../../mocks/random.ts';
import { type BenchDescription, SimulatedBench } from '../../mocks/simulated-bench.ts';
import { SimulatedClock } from '../../mocks/simulated-clock.ts';

type Device = 'analyzer' | 'positioner';

/** A bench that can be reached, and time that passes for it. */
export interface ReachableBench {
  bench: SimulatedBench;
  /** The driver's clock; on sockets it is the world's, while the bench's runs ahead. */
  clock: Clock;
  /** A moment of the bench's clock: what its truth is asked for. */
  nowMs: () => number;
  link: (device: Device) => Link;
  /** Lets time pass until `work` is settled; after `withinMs` of the driver's clock it counts as hanging. */
  run: <T>(work: Promise<T>, withinMs?: number) => Promise<T>;
  /** Lets so much of the bench's time pass. */
  pass: (ms: number) => Promise<void>;
  /** Calls `act` once after so much of the bench's time. */
  later: (ms: number, act: () => void) => void;
  /** Calls `act` again and again, every so many milliseconds of the bench's time, until told to end. */
  every: (ms: number, act: () => void) => () => void;
  close: () => Promise<void>;
}

export interface Wire {
  name: string;
  kind: 'memory' | 'sockets';
  /** `acceleration`: time of the bench for each millisecond of the world; of no meaning in virtual time. */
  reach: (description: BenchDescription, acceleration?: number) => Promise<ReachableBench>;
}

/** Half an hour: no single operation of a driver may take longer, whatever goes wrong. */
const hangingMs = 1_800_000;
/** On sockets that is far too long to wait for; the driver's own time-outs are a few seconds there. */
const socketHangingMs = 45_000;
const usualAcceleration = 60;

export const wires: readonly Wire[] = [
  memoryWire('memory', { latencyMs: 1 }),
  memoryWire('memory, byte by byte', { latencyMs: 1, cut: cutIntoBytes }),
  memoryWire('memory, in random pieces', { latencyMs: 1, cut: randomCutter(11) }),
  { name: 'sockets', kind: 'sockets', reach: reachBySockets },
];

function memoryWire(name: string, options: MemoryPortOptions): Wire {
  return {
    name,
    kind: 'memory',
    async reach(description) {
      const clock = new SimulatedClock();
      const bench = new SimulatedBench(clock, description);
      const ports = bench.listenInMemory(options);
      return {
        bench,
        clock,
        nowMs: () => clock.monotonicMs(),
        link: (device) => ports[device].link(),
        run: (work, withinMs = hangingMs) => clock.run(within(clock, withinMs, work)),
        pass: (ms) => clock.run(clock.sleep(ms)),
        later: (ms, act) => void clock.at(clock.monotonicMs() + ms, act),
        every: (ms, act) => repeat(clock, ms, act),
        close: () => clock.run(bench.close()),
      };
    },
  };
}

async function reachBySockets(
  description: BenchDescription,
  acceleration = usualAcceleration,
): Promise<ReachableBench> {
  const clock = new SystemClock();
  const fast = new AcceleratedClock(clock, acceleration);
  const bench = new SimulatedBench(fast, description);
  const ports = await bench.listenTcp('127.0.0.1', { analyzer: 0, positioner: 0 });
  return {
    bench,
    clock,
    nowMs: () => fast.monotonicMs(),
    link: (device) => TcpLink.to('127.0.0.1', ports[device], clock),
    run: (work, withinMs = socketHangingMs) => within(clock, Math.min(withinMs, socketHangingMs), work),
    pass: (ms) => fast.sleep(ms),
    later: (ms, act) => void fast.at(fast.monotonicMs() + ms, act),
    every: (ms, act) => repeat(fast, ms, act),
    close: () => bench.close(),
  };
}

async function within<T>(clock: Clock, ms: number, work: Promise<T>): Promise<T> {
  const settled = new AbortController();
  const late = clock.sleep(ms, settled.signal).then(
    () => {
      throw new Error(`it hangs: nothing came of it within ${ms / 1000} s`);
    },
    () => new Promise<never>(() => {}),
  );
  try {
    return await Promise.race([work, late]);
  } finally {
    settled.abort();
  }
}

function repeat(clock: Clock, ms: number, act: () => void): () => void {
  let cancel = (): void => {};
  const next = (): void => {
    act();
    cancel = clock.at(clock.monotonicMs() + ms, next);
  };
  next();
  return () => cancel();
}

function cutIntoBytes(bytes: Uint8Array): Uint8Array[] {
  return Array.from(bytes, (byte) => Uint8Array.of(byte));
}

function randomCutter(seed: number): (bytes: Uint8Array) => Uint8Array[] {
  const random = stream(seed, 'cuts of a wire');
  return (bytes) => {
    const pieces: Uint8Array[] = [];
    for (let at = 0; at < bytes.length; ) {
      const length = 1 + random.integer(Math.max(1, Math.min(40, bytes.length - at)));
      pieces.push(bytes.slice(at, at + length));
      at += length;
    }
    return pieces;
  };
}

export function analyzerOn(
  at: ReachableBench,
  options: Partial<Omit<ScpiAnalyzerOptions, 'onTraffic'>> = {},
): ScpiAnalyzer {
  return new ScpiAnalyzer(at.link('analyzer'), at.clock, {
    dialect: dialectNamed('numbered-parameter'),
    traceFormat: 'real64',
    byteOrder: 'normal',
    ...options,
  });
}

export const families = ['realtime-status', 'position-report'] as const;
export type Family = (typeof families)[number];

export function positionerOn(
  at: ReachableBench,
  axes: readonly AxisSetup[],
  family: Family = 'realtime-status',
): Positioner {
  const Driver = family === 'position-report' ? ReportPositioner : GcodePositioner;
  return new Driver(at.link('positioner'), at.clock, { axes });
}
