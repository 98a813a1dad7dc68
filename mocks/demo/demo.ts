// `npm run demo`: the main job without hardware. Starts the simulated bench on free local ports, then uses
// the daemon as an operator would, by its command line and in processes of its own, and prints the figures
// beside the scene's truth. The daemon gets a range file and plans; the truth stays here.
import { mkdir, mkdtemp, readFile, rm, writeFile } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join, resolve } from 'node:path';
import { fileURLToPath } from 'node:url';
import { Command, InvalidArgumentError, Option } from 'commander';
import { SystemClock } from '../../drivers/clock.ts';
import { AcceleratedClock } from '../accelerated-clock.ts';
import type { AntennaDescription, SceneDescription } from '../scene/scene-description.ts';
import { SimulatedBench } from '../simulated-bench.ts';
import { compareWithTruth } from './beside-truth.ts';
import { type Daemon, daemonIn } from './daemon-process.ts';

interface DemoOptions {
  antenna: 'yagi5' | 'dipole' | 'cardioid' | 'line-source';
  seed: number;
  rotate: number;
  snr: number;
  keep?: string;
}

/** The bench's time runs this much faster than the world's. */
const acceleration = 60;

const options = new Command('demo')
  .description('Measures a simulated antenna and prints the figures beside the truth.')
  .addOption(
    new Option('--antenna <kind>', 'what is measured')
      .choices(['yagi5', 'dipole', 'cardioid', 'line-source'])
      .default('yagi5'),
  )
  .option('--seed <number>', 'of the noise', decimal, 1)
  .option('--rotate <deg>', 'turns the antenna in its mount; the daemon is not told', decimal, 0)
  .option('--snr <dB>', 'signal-to-noise ratio of one reading', decimal, 70)
  .option('--keep <folder>', 'writes range file, plans and archive there and leaves them')
  .parse()
  .opts<DemoOptions>();

process.exitCode = await demonstrate(options);

async function demonstrate(options: DemoOptions): Promise<number> {
  const clock = new AcceleratedClock(new SystemClock(), acceleration);
  const bench = new SimulatedBench(clock, {
    scene: sceneOf(options),
    positioner: { settings: controllerSettings() },
  });
  const folder = options.keep ? resolve(options.keep) : await mkdtemp(join(tmpdir(), 'nightcut-demo-'));
  try {
    if (options.keep) await mkdir(folder, { recursive: true });
    const ports = await bench.listenTcp('127.0.0.1', { analyzer: 0, positioner: 0 });
    await writeFiles(folder, ports);
    say(`A simulated range: analyzer on port ${ports.analyzer}, positioner on port ${ports.positioner},`);
    say(`time ${acceleration} times as fast as the world's.\n`);
    return await measureBoth(bench, daemonIn(folder));
  } finally {
    await bench.close();
    if (!options.keep) await rm(folder, { recursive: true, force: true });
    else say(`Range file, plans and archive are in ${options.keep}.`);
  }
}

async function measureBoth(bench: SimulatedBench, daemon: Daemon): Promise<number> {
  say('First the reference antenna, a half-wave dipole, at boresight:');
  bench.mount('reference');
  const reference = await daemon.watched('measure', 'reference.plan.yaml');
  if (reference !== 0) return reference;
  say('Then the antenna under test on the same cable:');
  bench.mount('aut');
  const pattern = await daemon.watched('measure', 'yagi5.plan.yaml');
  if (pattern !== 0) return pattern;
  // A kept folder may hold runs of earlier demonstrations.
  const { runs } = JSON.parse(await daemon.answered('runs', '--json'));
  const document = JSON.parse(await daemon.answered('show', String(runs[0].number), '--json'));
  say(compareWithTruth(document, bench.truth({ frequenciesHz: document.markersHz })));
  return 0;
}

function sceneOf({ antenna, seed, rotate, snr }: DemoOptions): SceneDescription {
  const rotated = { rotateAzimuthDeg: rotate };
  const aut: AntennaDescription =
    antenna === 'line-source'
      ? { kind: antenna, lengthM: 1, frontToBackDb: 20, ...rotated }
      : { kind: antenna, ...rotated };
  return { seed, rangeLengthM: 6, antennas: { aut }, noise: { snrDb: snr } };
}

/** As the range file of the demo says: 20°/s and 40°/s² on every axis, in degrees. */
function controllerSettings(): Record<number, number> {
  const perAxis = [0, 1, 2].flatMap((axis): [number, number][] => [
    [110 + axis, 1200],
    [120 + axis, 40],
  ]);
  return Object.fromEntries(perAxis);
}

/** The files beside this one, with the ports in use and without waits that only real masts need. */
async function writeFiles(folder: string, ports: { analyzer: number; positioner: number }): Promise<void> {
  const source = (name: string): Promise<string> =>
    readFile(fileURLToPath(new URL(name, import.meta.url)), 'utf8');
  const range = (await source('range.yaml'))
    .replace('127.0.0.1:5025', `127.0.0.1:${ports.analyzer}`)
    .replace('127.0.0.1:5026', `127.0.0.1:${ports.positioner}`)
    .replaceAll('settle: 200 ms', 'settle: 0 ms');
  await writeFile(join(folder, 'range.yaml'), range);
  for (const name of ['reference.plan.yaml', 'yagi5.plan.yaml']) {
    await writeFile(join(folder, name), await source(name));
  }
}

function decimal(text: string): number {
  const value = Number(text);
  if (text.trim() === '' || !Number.isFinite(value)) throw new InvalidArgumentError('a number is wanted');
  return value;
}

function say(text: string): void {
  process.stdout.write(`${text}\n`);
}
