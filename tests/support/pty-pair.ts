// A pair of pseudo-terminals joined by socat: what is written into one end comes out of the other, through
// the kernel's terminal layer and the real serial binding.
import { type ChildProcess, execFileSync, spawn } from 'node:child_process';
import { existsSync } from 'node:fs';
import { mkdtemp, rm } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';

export interface PtyPair {
  near: string;
  far: string;
  /** Pulls the cable: both ends go away. */
  unplug(): Promise<void>;
  plug(): Promise<void>;
  remove(): Promise<void>;
}

/** One line where socat is missing, else undefined. */
export function missingSocat(): string | undefined {
  try {
    execFileSync('socat', ['-V'], { stdio: 'ignore' });
    return undefined;
  } catch {
    return 'serial lines are not tested: there is no socat (apt install socat)';
  }
}

export async function ptyPair(): Promise<PtyPair> {
  const folder = await mkdtemp(join(tmpdir(), 'nightcut-pty-'));
  const near = join(folder, 'near');
  const far = join(folder, 'far');
  let socat: ChildProcess | undefined;
  const plug = async (): Promise<void> => {
    const end = (path: string): string => `pty,raw,echo=0,link=${path}`;
    socat = spawn('socat', [end(near), end(far)], { stdio: 'ignore' });
    for (let tries = 0; tries < 500 && !(existsSync(near) && existsSync(far)); tries += 1) await pause(10);
  };
  const unplug = async (): Promise<void> => {
    const gone = socat;
    socat = undefined;
    if (!gone || gone.exitCode !== null || gone.signalCode !== null) return;
    await new Promise<void>((resolve) => {
      gone.once('exit', () => resolve());
      gone.kill('SIGKILL');
    });
    await rm(near, { force: true });
    await rm(far, { force: true });
  };
  await plug();
  return {
    near,
    far,
    plug,
    unplug,
    async remove() {
      await unplug();
      await rm(folder, { recursive: true, force: true });
    },
  };
}

function pause(ms: number): Promise<void> {
  return new Promise((resolve) => setTimeout(resolve, ms));
}
