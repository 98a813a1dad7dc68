// The daemon as the demo meets it: its command line, in a process of its own.
import { spawn } from 'node:child_process';
import { fileURLToPath } from 'node:url';

export interface Daemon {
  /** Output goes to the terminal; resolves to the exit code. */
  watched(...args: string[]): Promise<number>;
  /** Resolves to what it printed; rejects when it failed. */
  answered(...args: string[]): Promise<string>;
}

/** `folder`: where range file, plans and archive are. */
export function daemonIn(folder: string): Daemon {
  const start = (args: readonly string[], stdout: 'inherit' | 'pipe') =>
    spawn(process.execPath, ['--import', import.meta.resolve('tsx'), entry, ...args], {
      cwd: folder,
      stdio: ['ignore', stdout, 'inherit'],
    });
  return {
    watched(...args) {
      const child = start(args, 'inherit');
      return new Promise((resolve, reject) => {
        child.once('error', reject);
        child.once('exit', (code) => resolve(code ?? 1));
      });
    },
    answered(...args) {
      const child = start(args, 'pipe');
      let text = '';
      child.stdout?.setEncoding('utf8').on('data', (piece: string) => {
        text += piece;
      });
      return new Promise((resolve, reject) => {
        child.once('error', reject);
        child.once('close', (code) => {
          if (code === 0) resolve(text);
          else reject(new Error(`nightcut ${args.join(' ')} ended with ${code}`));
        });
      });
    },
  };
}

const entry = fileURLToPath(new URL('../../daemon/main.ts', import.meta.url));
