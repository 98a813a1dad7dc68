// A written file from disk as text, with a limit on its size. What it says is the parsers' business.
import { open, stat } from 'node:fs/promises';
import { DaemonError } from '../errors.ts';
import { fileInvalid, shown } from './file-problems.ts';
import { largestFile, tooLarge } from './yaml-tree.ts';

/**
 * Throws FILE_UNREADABLE (facts: `file`, `reason`) with `remedy` as the end of its message, FILE_INVALID
 * when the file is too large or not UTF-8. A byte order mark is dropped.
 */
export async function readText(file: string, remedy: string): Promise<string> {
  const bytes = await readBytes(file, remedy);
  if (bytes.length > largestFile) throw fileInvalid(file, [tooLarge]);
  try {
    return new TextDecoder('utf-8', { fatal: true }).decode(bytes);
  } catch (cause) {
    throw fileInvalid(file, [{ line: 1, path: [], text: 'expected UTF-8 text; found other bytes' }], cause);
  }
}

async function readBytes(file: string, remedy: string): Promise<Uint8Array> {
  try {
    // Before opening: a pipe without a writer would never open.
    if (!(await stat(file)).isFile()) throw unreadable(file, 'it is no regular file', remedy);
    const handle = await open(file, 'r');
    try {
      const buffer = new Uint8Array(largestFile + 1);
      let length = 0;
      for (;;) {
        const { bytesRead } = await handle.read(buffer, length, buffer.length - length, null);
        length += bytesRead;
        if (bytesRead === 0 || length === buffer.length) return buffer.subarray(0, length);
      }
    } finally {
      await handle.close();
    }
  } catch (cause) {
    if (cause instanceof DaemonError) throw cause;
    throw unreadable(file, reasonOf(cause), remedy, cause);
  }
}

function unreadable(file: string, reason: string, remedy: string, cause?: unknown): DaemonError {
  const message = `${shown(file, 200)}: cannot be read: ${reason}; ${remedy}`;
  return new DaemonError('FILE_UNREADABLE', message, { file, reason }, cause);
}

function reasonOf(cause: unknown): string {
  const code = (cause as { code?: unknown } | null)?.code;
  if (code === 'ENOENT' || code === 'ENOTDIR') return 'there is no such file';
  if (code === 'EACCES' || code === 'EPERM') return 'its permissions do not allow it';
  return typeof code === 'string' ? code : 'the name cannot be used';
}
