// One session of `nightcut-mock serve`: opens the ports, says where they are, obeys lines from standard input
// until it is told to stop. The end of the input stops nothing: a bench in the background has none. What the bench is made of comes from the command line.
import { createInterface } from 'node:readline';
import type { Clock } from '../drivers/clock.ts';
import { AcceleratedClock } from './accelerated-clock.ts';
import { faultNamed, faults } from './faults/fault-table.ts';
import { type BenchDescription, SimulatedBench } from './simulated-bench.ts';
import { truthText } from './truth-text.ts';

export interface MockSurroundings {
  clock: Clock;
  stdin: NodeJS.ReadableStream;
  stdout: { write(text: string): unknown };
  stderr: { write(text: string): unknown };
  /** Calls `stop` on a stop signal; returns how to leave off. */
  onStopSignal: (stop: () => void) => () => void;
}

export interface ServeOptions {
  bench: BenchDescription;
  host: string;
  ports: { analyzer: number; positioner: number };
  /** How much faster than the world the bench's time runs. */
  accelerate: number;
  json: boolean;
}

/** Serves until a stop signal or the line `quit`. Throws LINK_OPEN_FAILED, SceneError. */
export async function serve(options: ServeOptions, around: MockSurroundings): Promise<void> {
  const bench = new SimulatedBench(new AcceleratedClock(around.clock, options.accelerate), options.bench);
  try {
    const ports = await bench.listenTcp(options.host, options.ports);
    around.stdout.write(
      options.json ? `${JSON.stringify(announcement(options, ports))}\n` : greeting(options, ports),
    );
    await obey(bench, options.json, around);
  } finally {
    await bench.close();
  }
}

function announcement(options: ServeOptions, ports: ServeOptions['ports']): object {
  const at = (port: number): string => `tcp://${options.host}:${port}`;
  return {
    analyzer: { link: at(ports.analyzer), port: ports.analyzer },
    positioner: { link: at(ports.positioner), port: ports.positioner },
    antenna: options.bench.scene?.antennas?.aut?.kind ?? 'yagi5',
    accelerate: options.accelerate,
  };
}

function greeting(options: ServeOptions, ports: ServeOptions['ports']): string {
  const kind = options.bench.scene?.antennas?.aut?.kind ?? 'yagi5';
  return [
    `analyzer    tcp://${options.host}:${ports.analyzer}`,
    `positioner  tcp://${options.host}:${ports.positioner}`,
    `on the mast ${kind}; 'mount reference' puts the reference antenna there`,
    `lines here  mount reference · mount aut · truth · fault NAME · faults · quit`,
    '',
  ].join('\n');
}

/** Obeys lines until one says quit or a stop signal comes. */
function obey(bench: SimulatedBench, json: boolean, around: MockSurroundings): Promise<void> {
  return new Promise((resolve) => {
    const lines = createInterface({ input: around.stdin, terminal: false });
    const stop = (): void => {
      leaveOff();
      lines.close();
      resolve();
    };
    const leaveOff = around.onStopSignal(stop);
    lines.on('line', (line) => {
      const words = line.trim().split(/\s+/).filter(Boolean);
      if (words[0] === 'quit') return stop();
      const outcome = carryOut(bench, words);
      if (outcome !== undefined) tell(outcome, json, around);
    });
  });
}

type Outcome = { done: string; data?: object } | { refused: string };

function carryOut(bench: SimulatedBench, words: readonly string[]): Outcome | undefined {
  const [verb, what] = words;
  if (verb === undefined) return undefined;
  if (verb === 'mount' && (what === 'reference' || what === 'aut')) {
    bench.mount(what);
    return { done: `${what} is on the mast` };
  }
  if (verb === 'mount') return { refused: 'mount what: reference or aut' };
  if (verb === 'truth') return { done: 'truth', data: bench.truth() };
  if (verb === 'faults') return { done: 'faults', data: faults.map(({ name, does }) => ({ name, does })) };
  if (verb === 'fault') {
    if (what === undefined || !faultNamed(what)) return { refused: `no fault is called '${what ?? ''}'` };
    bench.faults.inject(what);
    return { done: `${what} has struck` };
  }
  return { refused: `no such line: '${verb}'` };
}

function tell(outcome: Outcome, json: boolean, around: MockSurroundings): void {
  if (json) around.stdout.write(`${truthText(outcome)}\n`);
  else if ('refused' in outcome) around.stderr.write(`${outcome.refused}\n`);
  else around.stdout.write(`${outcome.data ? truthText(outcome.data, 2) : outcome.done}\n`);
}
