// One process drives a device. The lock is an exclusive SQLite transaction on a small file named after the
// device's endpoint, so that the system releases it when the process dies, however it dies. It is no archive:
// nothing is stored in it.
import { createHash } from 'node:crypto';
import { mkdirSync, readFileSync, realpathSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import Database from 'better-sqlite3';
import { DaemonError } from '../errors.ts';
import type { LinkAddress } from '../files/range-file.ts';

export interface DeviceLock {
  release(): void;
}

export interface DeviceHolder {
  pid: number;
  /** What it does there, such as `measure yagi.plan.yaml`. */
  work: string;
}

/**
 * Locks every endpoint or none. Throws RANGE_HELD, told who holds it, and ARCHIVE_UNUSABLE when no lock file
 * can be made. `folder` is shared by all users of the machine.
 */
export function lockDevices(
  addresses: readonly LinkAddress[],
  holder: DeviceHolder,
  folder = join(tmpdir(), 'nightcut-locks'),
): DeviceLock {
  const held: DeviceLock[] = [];
  const release = (): void => {
    for (const lock of held.splice(0)) lock.release();
  };
  try {
    mkdirSync(folder, { recursive: true, mode: 0o1777 });
    for (const address of addresses) held.push(lockOne(endpointOf(address), holder, folder));
  } catch (error) {
    release();
    if (error instanceof DaemonError) throw error;
    const why = error instanceof Error ? error.message : String(error);
    throw new DaemonError(
      'ARCHIVE_UNUSABLE',
      `${folder}: no lock can be kept here: ${why}`,
      { folder },
      error,
    );
  }
  return { release };
}

/** One name for one device, however its address is written: by-id links lead to the same file. */
export function endpointOf(address: LinkAddress): string {
  if (address.kind === 'tcp') {
    const host = address.host.toLowerCase().replace(/\.$/, '');
    return `tcp://${host === 'localhost' || host === '::1' ? '127.0.0.1' : host}:${address.port}`;
  }
  try {
    return `serial://${realpathSync(address.path)}`;
  } catch {
    return `serial://${address.path}`;
  }
}

function lockOne(endpoint: string, holder: DeviceHolder, folder: string): DeviceLock {
  const name = createHash('sha256').update(endpoint).digest('hex').slice(0, 24);
  const path = join(folder, `${name}.lock`);
  const whoPath = join(folder, `${name}.json`);
  const database = new Database(path, { timeout: 0 });
  try {
    database.pragma('journal_mode = DELETE');
    database.exec('BEGIN EXCLUSIVE');
  } catch (error) {
    database.close();
    if ((error as { code?: unknown }).code !== 'SQLITE_BUSY') throw error;
    const who = readHolder(whoPath);
    throw new DaemonError(
      'RANGE_HELD',
      `${endpoint} is held by another process${who ? ` (${who.pid}: ${who.work})` : ''}`,
      { endpoint, ...(who ?? {}) },
      error,
    );
  }
  writeFileSync(whoPath, JSON.stringify(holder), { mode: 0o666 });
  return {
    release() {
      if (!database.open) return;
      database.exec('ROLLBACK');
      database.close();
    },
  };
}

function readHolder(path: string): DeviceHolder | undefined {
  try {
    const { pid, work } = JSON.parse(readFileSync(path, 'utf8'));
    return { pid: Number(pid), work: String(work) };
  } catch {
    return undefined;
  }
}
