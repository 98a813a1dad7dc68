// The arguments of `nightcut-mock`: what stands on the mast and on the range, where to listen, how fast time
// runs. Bad usage is one line to standard error and exit code 2; hardware trouble, such as a taken port, is 3.
import { Command, CommanderError, InvalidArgumentError, Option } from 'commander';
import type { AntennaDescription, SceneDescription } from './scene/scene-description.ts';
import { type MockSurroundings, serve } from './serve.ts';
import { type BenchDescription, SimulatedBench } from './simulated-bench.ts';
import { truthText } from './truth-text.ts';

interface SceneOptions {
  antenna: AntennaDescription['kind'];
  seed: number;
  rotate: number;
  length: number;
  snr: number;
}

interface ServeArguments extends SceneOptions {
  analyzer: (typeof commandTrees)[number];
  controller: (typeof controllerFamilies)[number];
  gearPlay: number;
  accelerate: number;
  host: string;
  analyzerPort: number;
  positionerPort: number;
  json?: boolean;
}

interface TruthArguments extends SceneOptions {
  at: number[];
  band: [number, number];
  mounted: 'aut' | 'reference';
}

const commandTrees = ['numbered-parameter', 'named-measurement', 'selected-trace'] as const;
const controllerFamilies = ['realtime-status', 'position-report'] as const;
const antennaKinds: AntennaDescription['kind'][] = [
  'yagi5',
  'dipole',
  'half-wave-dipole',
  'isotropic',
  'cardioid',
  'line-source',
];

/** Runs the command line and returns the exit code. */
export async function runMockCommandLine(args: readonly string[], around: MockSurroundings): Promise<number> {
  const program = build(around);
  try {
    await program.parseAsync([...args], { from: 'user' });
    return 0;
  } catch (error) {
    if (error instanceof CommanderError) {
      // Asked-for help and version are no mistakes; commander has printed what there is to say.
      return error.exitCode === 0 ? 0 : 2;
    }
    const code = error instanceof Error && 'code' in error ? String(error.code) : undefined;
    if (code !== 'LINK_OPEN_FAILED' && code !== 'SCENE_INVALID') throw error;
    around.stderr.write(`nightcut-mock: ${(error as Error).message}\n`);
    return code === 'LINK_OPEN_FAILED' ? 3 : 2;
  }
}

function build(around: MockSurroundings): Command {
  const program = new Command('nightcut-mock')
    .description('A simulated bench: analyzer, positioner and an antenna on the mast, for any client.')
    .helpCommand(false);
  const serveCommand = withScene(program.command('serve'))
    .description('Serve both devices over TCP until a stop signal or the line `quit`.')
    .addOption(
      new Option('--analyzer <dialect>', 'how the analyzer is spoken to')
        .choices(commandTrees)
        .default('numbered-parameter'),
    )
    .addOption(
      new Option('--controller <family>', 'how the motion controller is spoken to')
        .choices(controllerFamilies)
        .default('realtime-status'),
    )
    .option('--gear-play <deg>', 'gear play of every axis', decimal, 0)
    .option('--accelerate <factor>', 'how much faster than the world time runs', positive, 1)
    .option('--host <address>', 'where to listen', '127.0.0.1')
    .option('--analyzer-port <port>', 'of the analyzer; 0 takes any free one', portNumber, 5025)
    .option('--positioner-port <port>', 'of the positioner; 0 takes any free one', portNumber, 5026)
    .option('--json', 'say everything in JSON, one line each')
    .action(async (options: ServeArguments) => {
      await serve(
        {
          bench: benchOf(options),
          host: options.host,
          ports: { analyzer: options.analyzerPort, positioner: options.positionerPort },
          accelerate: options.accelerate,
          json: options.json ?? false,
        },
        around,
      );
    });
  const truthCommand = withScene(program.command('truth'))
    .description('Print what the antenna really does, as JSON.')
    .option('--at <MHz...>', 'frequencies', collectDecimals, [868])
    .option('--band <MHz,MHz>', 'where the best match is looked for', band, [820, 920])
    .addOption(new Option('--mounted <what>', 'on the mast').choices(['aut', 'reference']).default('aut'))
    .action((options: TruthArguments) => {
      const bench = new SimulatedBench(around.clock, { scene: sceneOf(options) });
      const truth = bench.truth({
        frequenciesHz: options.at.map((megahertz) => megahertz * 1e6),
        bandHz: [options.band[0] * 1e6, options.band[1] * 1e6],
        which: options.mounted,
      });
      around.stdout.write(`${truthText(truth, 2)}\n`);
    });
  for (const command of [program, serveCommand, truthCommand]) {
    command
      .exitOverride()
      .showSuggestionAfterError(false)
      .allowExcessArguments(false)
      .configureOutput({
        writeOut: (text) => void around.stdout.write(text),
        writeErr: (text) => void around.stderr.write(text),
        outputError: (text, write) => write(`nightcut-mock: ${text.replace(/^error: /, '').trim()}\n`),
      });
  }
  program.allowExcessArguments(true).action(() => program.error('say what to do: serve or truth'));
  return program;
}

function withScene(command: Command): Command {
  return command
    .addOption(
      new Option('--antenna <kind>', 'the antenna under test').choices(antennaKinds).default('yagi5'),
    )
    .option('--seed <number>', 'of noise, drift and faults', decimal, 1)
    .option('--rotate <deg>', 'turns the antenna under test in its mount', decimal, 0)
    .option('--length <m>', 'of a line source', positive, 1)
    .option('--snr <dB>', 'signal-to-noise ratio at 1 kHz, one average, 0 dBm', decimal, 70);
}

function sceneOf(options: SceneOptions): SceneDescription {
  const kind = options.antenna;
  const rotated = { rotateAzimuthDeg: options.rotate };
  const aut: AntennaDescription =
    kind === 'line-source' ? { kind, lengthM: options.length, ...rotated } : { kind, ...rotated };
  return { seed: options.seed, antennas: { aut }, rangeLengthM: 6, noise: { snrDb: options.snr } };
}

/** The demo's stage: 20°/s and 40°/s² on every axis. */
function benchOf(options: ServeArguments): BenchDescription {
  const axis = { playUnits: options.gearPlay };
  const settings = Object.fromEntries(
    [0, 1, 2].flatMap((index) => [
      [110 + index, 1200],
      [120 + index, 40],
    ]),
  );
  return {
    scene: sceneOf(options),
    analyzer: { commandTree: options.analyzer },
    positioner: { family: options.controller, settings, mechanics: { X: axis, Y: axis, Z: axis } },
  };
}

function decimal(text: string): number {
  const value = Number(text);
  if (text.trim() === '' || !Number.isFinite(value)) throw new InvalidArgumentError('a number is wanted');
  return value;
}

function positive(text: string): number {
  const value = decimal(text);
  if (value <= 0) throw new InvalidArgumentError('a number above 0 is wanted');
  return value;
}

function portNumber(text: string): number {
  const value = decimal(text);
  if (!Number.isInteger(value) || value < 0 || value > 65_535) {
    throw new InvalidArgumentError('a port is a whole number from 0 to 65535');
  }
  return value;
}

function band(text: string): [number, number] {
  const [from, to, ...more] = text.split(',').map(positive);
  if (from === undefined || to === undefined || more.length > 0 || from >= to) {
    throw new InvalidArgumentError('two frequencies in MHz are wanted, the lower one first');
  }
  return [from, to];
}

const defaultsSeen = new WeakSet<number[]>();

/** Gathers repeated values; the first one given replaces the default. */
function collectDecimals(text: string, before: number[]): number[] {
  const list = defaultsSeen.has(before) ? [...before, decimal(text)] : [decimal(text)];
  defaultsSeen.add(list);
  return list;
}
