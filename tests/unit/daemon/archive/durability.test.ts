// A sample once announced is never lost: a process that writes is killed without warning, again and again,
// and what it had announced is looked for in the file. The loss of power cannot be tested so; for that the
// store waits for the disk at every commit (open-database.test.ts).
import { type ChildProcess, spawn } from 'node:child_process';
import { once } from 'node:events';
import { createInterface } from 'node:readline';
import { fileURLToPath } from 'node:url';
import { describe, expect, it, onTestFinished } from 'vitest';
import { InThreadArchive } from '../../../../daemon/archive/in-thread-archive.ts';
import { hashSamples } from '../../../../daemon/archive/run-hash.ts';
import { durableSample } from './durable-samples.ts';
import { freshPath } from './fresh-path.ts';

const writer = fileURLToPath(new URL('./durability-writer.ts', import.meta.url));
const run = 1;

function startWriter(path: string, newOne: boolean, first: number): ChildProcess {
  const args = ['--import', 'tsx', writer, path, newOne ? '0' : `${run}`, `${first}`];
  const child = spawn(process.execPath, args, { stdio: ['ignore', 'pipe', 'inherit'] });
  onTestFinished(() => void child.kill('SIGKILL'));
  return child;
}

/** Calls `heard` with each announced sequence, the last ones before a death included; answers when it is dead. */
async function listen(child: ChildProcess, heard: (sequence: number) => void): Promise<void> {
  const ended = once(child, 'exit');
  for await (const line of createInterface({ input: child.stdout! })) heard(Number(line));
  await ended;
}

/** A small generator of known quality is not needed here, only one that repeats (Park and Miller, 1988). */
function repeatable(seed: number): (below: number) => number {
  let state = seed;
  return (below) => {
    state = (state * 16807) % 2147483647;
    return state % below;
  };
}

function expected(count: number) {
  return Array.from({ length: count }, (_, i) => durableSample(i + 1));
}

describe('durability', () => {
  const seed = 20251019;
  it(`keeps every announced sample through kill -9 (seed ${seed})`, { timeout: 240_000 }, async () => {
    const random = repeatable(seed);
    const path = freshPath();
    let stored = 0;
    for (let round = 0; round < 6; round += 1) {
      const child = startWriter(path, round === 0, stored + 1);
      const killAt = stored + 1 + random(150);
      const delayMs = random(8);
      let announced = stored;
      await listen(child, (sequence) => {
        expect(sequence).toBe(announced + 1);
        announced = sequence;
        if (sequence === killAt) setTimeout(() => child.kill('SIGKILL'), delayMs);
      });
      expect(child.signalCode).toBe('SIGKILL');
      expect(announced).toBeGreaterThanOrEqual(killAt);

      const archive = InThreadArchive.open(path);
      const samples = await archive.samples(run);
      await archive.close();
      // One more may have reached the disk before it could be announced; none may be missing or doubled.
      expect([announced, announced + 1]).toContain(samples.length);
      expect(samples.map(({ sequence }) => sequence)).toEqual(samples.map((_, i) => i + 1));
      expect(hashSamples(samples)).toBe(hashSamples(expected(samples.length)));
      stored = samples.length;
    }
  });

  it('lets another process read what has been announced while one writes', { timeout: 120_000 }, async () => {
    const path = freshPath();
    const child = startWriter(path, true, 1);
    let reader: InThreadArchive | undefined;
    const reads: { announced: number; read: number }[] = [];
    let reading = Promise.resolve();
    await listen(child, (announced) => {
      if (announced % 20 !== 0 || reads.length >= 8) return;
      reading = reading.then(async () => {
        reader ??= InThreadArchive.open(path);
        const samples = await reader.samples(run);
        expect(hashSamples(samples)).toBe(hashSamples(expected(samples.length)));
        if (reads.push({ announced, read: samples.length }) === 8) child.kill('SIGKILL');
      });
    });
    await reading;
    await reader?.close();
    expect(reads).toHaveLength(8);
    for (const { announced, read } of reads) expect(read).toBeGreaterThanOrEqual(announced);
  });
});
