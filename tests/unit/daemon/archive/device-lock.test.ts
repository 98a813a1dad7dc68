import { spawn } from 'node:child_process';
import { mkdtempSync, rmSync, symlinkSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterEach, beforeEach, expect, it } from 'vitest';
import { endpointOf, lockDevices } from '../../../../daemon/archive/device-lock.ts';

let folder: string;
beforeEach(() => {
  folder = mkdtempSync(join(tmpdir(), 'nightcut-lock-test-'));
});
afterEach(() => rmSync(folder, { recursive: true, force: true }));

const analyzer = { kind: 'tcp', host: 'analyzer.example', port: 5025 } as const;
const positioner = { kind: 'tcp', host: '127.0.0.1', port: 5026 } as const;
const me = { pid: process.pid, work: 'measure a.plan.yaml' };

it('refuses a second holder, told who the first is, and lets go', () => {
  const lock = lockDevices([analyzer, positioner], me, folder);
  expect(() => lockDevices([positioner], { pid: 1, work: 'x' }, folder)).toThrow(
    expect.objectContaining({
      code: 'RANGE_HELD',
      message: expect.stringContaining(`${process.pid}: measure a.plan.yaml`),
    }),
  );
  lock.release();
  lock.release();
  lockDevices([positioner], me, folder).release();
});

it('locks all endpoints or none', () => {
  const other = lockDevices([positioner], me, folder);
  expect(() => lockDevices([analyzer, positioner], me, folder)).toThrow();
  lockDevices([analyzer], me, folder).release();
  other.release();
});

it('knows one device by its several names', () => {
  expect(endpointOf({ kind: 'tcp', host: 'LOCALHOST', port: 1 })).toBe(
    endpointOf({ kind: 'tcp', host: '127.0.0.1', port: 1 }),
  );
  const device = join(folder, 'ttyACM0');
  const alias = join(folder, 'by-id');
  writeFileSync(device, '');
  symlinkSync(device, alias);
  expect(endpointOf({ kind: 'serial', path: alias, baud: 9600 })).toBe(
    endpointOf({ kind: 'serial', path: device, baud: 115_200 }),
  );
  expect(endpointOf({ kind: 'serial', path: '/absent/tty', baud: 9600 })).toBe('serial:///absent/tty');
});

it('is released by the system when its process is killed', async () => {
  const program = `
    import { lockDevices } from ${JSON.stringify(new URL('../../../../daemon/archive/device-lock.ts', import.meta.url).pathname)};
    lockDevices([${JSON.stringify(positioner)}], { pid: process.pid, work: 'a child' }, ${JSON.stringify(folder)});
    console.log('held');
    setInterval(() => {}, 1000);
  `;
  const file = join(folder, 'child.mts');
  writeFileSync(file, program);
  const child = spawn(process.execPath, ['--import', 'tsx', file], { stdio: ['ignore', 'pipe', 'inherit'] });
  await new Promise<void>((resolve) => child.stdout!.once('data', () => resolve()));
  expect(() => lockDevices([positioner], me, folder)).toThrow(
    expect.objectContaining({ code: 'RANGE_HELD' }),
  );
  const gone = new Promise((resolve) => child.once('exit', resolve));
  child.kill('SIGKILL');
  await gone;
  lockDevices([positioner], me, folder).release();
});

it('says where no lock can be kept', () => {
  const blocked = join(folder, 'file');
  writeFileSync(blocked, '');
  expect(() => lockDevices([positioner], me, join(blocked, 'locks'))).toThrow(
    expect.objectContaining({ code: 'ARCHIVE_UNUSABLE' }),
  );
});
