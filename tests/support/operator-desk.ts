// An operator's desk for tests of the command line: a folder with range file and plans, a simulated bench on
// local ports that counts its visitors, and the commands in this process or in one of their own.
import { type ChildProcess, spawn } from 'node:child_process';
import { mkdtemp, readFile, rm, writeFile } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { runCommandLine } from '../../daemon/cli/command-line.ts';
import { SystemClock } from '../../drivers/clock.ts';
import { AcceleratedClock } from '../../mocks/accelerated-clock.ts';
import { type BenchDescription, SimulatedBench } from '../../mocks/simulated-bench.ts';

export interface Ended {
  exitCode: number;
  out: string;
  err: string;
}

export interface Started {
  child: ChildProcess;
  ended: Promise<Ended>;
}

export interface DeskOptions {
  scene?: BenchDescription['scene'];
  /** Time of the bench for each millisecond of the world. */
  acceleration?: number;
}

export class OperatorDesk {
  readonly folder: string;
  readonly bench: SimulatedBench;
  readonly benchClock: AcceleratedClock;
  readonly #clock = new SystemClock();
  #visitors = 0;
  #ports = { analyzer: 0, positioner: 0 };

  private constructor(folder: string, options: DeskOptions) {
    this.folder = folder;
    this.benchClock = new AcceleratedClock(this.#clock, options.acceleration ?? 60);
    this.bench = new SimulatedBench(this.benchClock, {
      // No two readings are alike bit for bit, and nothing else is seen of the noise.
      scene: { rangeLengthM: 6, noise: { snrDb: 100, reflectionSnrDb: 100 }, ...options.scene },
      positioner: { settings: stageSettings() },
    });
    this.#countVisitors();
  }

  /** A folder with `range.yaml`, `reference.plan.yaml` and `pattern.plan.yaml`, and a bench that listens. */
  static async open(options: DeskOptions = {}): Promise<OperatorDesk> {
    const desk = new OperatorDesk(await mkdtemp(join(tmpdir(), 'nightcut-desk-')), options);
    desk.#ports = await desk.bench.listenTcp('127.0.0.1', { analyzer: 0, positioner: 0 });
    await desk.write('range.yaml', desk.rangeText());
    await desk.write('reference.plan.yaml', referencePlanText);
    await desk.write('pattern.plan.yaml', patternPlanText());
    return desk;
  }

  /** How often somebody has connected to either device. */
  get visitors(): number {
    return this.#visitors;
  }

  get archivePath(): string {
    return join(this.folder, 'nightcut.sqlite');
  }

  async close(): Promise<void> {
    await this.bench.close();
    await rm(this.folder, { recursive: true, force: true });
  }

  path(name: string): string {
    return join(this.folder, name);
  }

  async write(name: string, text: string): Promise<void> {
    await writeFile(this.path(name), text);
  }

  /** The lines of the log beside the archive, as values. */
  async log(): Promise<Record<string, unknown>[]> {
    const text = await readFile(`${this.archivePath}.log`, 'utf8');
    return text
      .split('\n')
      .filter((line) => line !== '')
      .map((line) => JSON.parse(line) as Record<string, unknown>);
  }

  /** The command in this process, the range file of the desk named. `stop` gets what a stop signal would call. */
  async run(args: readonly string[], stop: (ask: () => void) => void = () => {}): Promise<Ended> {
    let out = '';
    let err = '';
    const exitCode = await runCommandLine(this.#withRange(args), {
      clock: this.#clock,
      stdout: { write: (text) => (out += text) },
      stderr: { write: (text) => (err += text) },
      onStopSignal: (ask) => {
        stop(ask);
        return () => {};
      },
    });
    return { exitCode, out, err };
  }

  /** The command as a process of its own, in the desk's folder. */
  start(args: readonly string[]): Started {
    const entry = fileURLToPath(new URL('../../daemon/main.ts', import.meta.url));
    const loader = import.meta.resolve('tsx');
    const child = spawn(process.execPath, ['--import', loader, entry, ...args], {
      cwd: this.folder,
      stdio: ['ignore', 'pipe', 'pipe'],
    });
    let out = '';
    let err = '';
    child.stdout.setEncoding('utf8').on('data', (text: string) => (out += text));
    child.stderr.setEncoding('utf8').on('data', (text: string) => (err += text));
    const ended = new Promise<Ended>((resolve, reject) => {
      child.once('error', reject);
      child.once('close', (code, signal) => {
        if (code === null) reject(new Error(`ended by ${signal}: ${err}`));
        else resolve({ exitCode: code, out, err });
      });
    });
    return { child, ended };
  }

  rangeText(): string {
    const axis = (word: string): string => `
      word: ${word}
      unitsPerDegree: 1
      travel: { min: -200 deg, max: 200 deg }
      rate: 20 deg/s
      acceleration: 40 deg/s2
      approach: { from: below, by: 2 deg }
      settle: 0 ms
      tolerance: 0.05 deg
      homing: none
      sense: +1
      boresight: 0 deg`;
    return `range: test meadow
rangeLength: 6 m
analyzer:
  link: tcp://127.0.0.1:${this.#ports.analyzer}
  dialect: numbered-parameter
  autPort: 1
  trace: { format: real64, byteOrder: normal }
positioner:
  link: tcp://127.0.0.1:${this.#ports.positioner}
  family: realtime-status
  axes:
    azimuth:${axis('X')}
    elevation:${axis('Y')}
antennas:
  rangeAntenna: range antenna
  reference:
    name: half-wave dipole
    gain:
      stated: ieee
      table:
        - { at: 820 MHz, gain: 2.0994 dBi }
        - { at: 868 MHz, gain: 2.144 dBi }
        - { at: 920 MHz, gain: 2.198 dBi }
archive: nightcut.sqlite
`;
  }

  #withRange(args: readonly string[]): string[] {
    const [command, ...rest] = args;
    if (command === undefined) return [];
    const takesRange =
      ['check', 'measure', 'resume', 'runs', 'show'].includes(command) && !rest.includes('--range');
    return takesRange ? [command, '--range', this.path('range.yaml'), ...rest] : [...args];
  }

  #countVisitors(): void {
    const { instrument, controller } = this.bench;
    const accept = instrument.accept.bind(instrument);
    instrument.accept = (visitor) => {
      this.#visitors += 1;
      accept(visitor);
    };
    const connect = controller.connect.bind(controller);
    controller.connect = (visitor) => {
      this.#visitors += 1;
      connect(visitor);
    };
  }
}

/** As the range file says: 20°/s and 40°/s² on every axis. */
function stageSettings(): Record<number, number> {
  const perAxis = [0, 1, 2].flatMap((axis): [number, number][] => [
    [110 + axis, 1200],
    [120 + axis, 40],
  ]);
  return Object.fromEntries(perAxis);
}

const referencePlanText = `antenna: { name: half-wave dipole, revision: A }
kind: reference
band: { from: 820 MHz, to: 920 MHz, points: 11 }
markers: [870 MHz]
analyzer: { ifBandwidth: 1 kHz, power: 0 dBm, averages: 1 }
`;

/** A full turn in azimuth in steps of 10°, on 11 frequencies. */
export function patternPlanText(changes: { gainReference?: string; points?: number } = {}): string {
  return `antenna: { name: river-gauge yagi, revision: C }
kind: pattern
band: { from: 820 MHz, to: 920 MHz, points: ${changes.points ?? 11} }
markers: [870 MHz]
analyzer: { ifBandwidth: 1 kHz, power: 0 dBm, averages: 1 }
gainReference: ${changes.gainReference ?? 'latest'}
cuts:
  - { name: azimuth, axis: azimuth, plane: H, from: -180 deg, to: 180 deg, step: 10 deg }
ties: { every: 12 }
checks: { closure: 0.2 dB, drift: 0.5 dB }
`;
}
