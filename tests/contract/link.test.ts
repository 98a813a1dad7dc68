// What every wire promises, one body run on each of them: opening and reopening, order of bytes, closing and
// who did it, and what is refused.
import { createServer, type Server } from 'node:net';
import { afterEach, describe, expect, it } from 'vitest';
import { nextTurn, SystemClock } from '../../drivers/clock.ts';
import { DriverError } from '../../drivers/errors.ts';
import type { Link, LinkClosed, LinkListener } from '../../drivers/link/link.ts';
import { MemoryPort } from '../../drivers/link/memory.ts';
import { listenTcp, TcpLink } from '../../drivers/link/tcp.ts';

interface Wire {
  link: Link;
  /** Visitors as the accepting side sees them, oldest first. */
  visitors: Link[];
  listener: LinkListener;
  /** A link to a place where nobody listens. */
  deserted: Link;
}

interface Kind {
  kind: string;
  build: () => Promise<Wire>;
}

const clock = new SystemClock();
const closing: (() => Promise<void>)[] = [];

afterEach(async () => {
  for (const close of closing.splice(0)) await close();
});

const kinds: Kind[] = [
  { kind: 'in-memory', build: () => buildMemory(undefined) },
  {
    kind: 'in-memory, cut into bytes',
    build: () => buildMemory((bytes) => [...bytes].map((b) => Uint8Array.of(b))),
  },
  { kind: 'TCP', build: buildTcp },
];

async function buildMemory(cut: ((bytes: Uint8Array) => Uint8Array[]) | undefined): Promise<Wire> {
  const port = new MemoryPort(clock, 'memory://test', cut ? { cut, latencyMs: 1 } : {});
  const visitors: Link[] = [];
  const listener = port.listen((visitor) => visitors.push(visitor));
  return { link: port.link(), visitors, listener, deserted: new MemoryPort(clock).link() };
}

async function buildTcp(): Promise<Wire> {
  const visitors: Link[] = [];
  const listener = await listenTcp('127.0.0.1', 0, (visitor) => visitors.push(visitor));
  const unused = await new Promise<number>((resolve) => {
    const server: Server = createServer().listen(0, '127.0.0.1', () => {
      const address = server.address();
      server.close(() => resolve(typeof address === 'object' && address ? address.port : 0));
    });
  });
  closing.push(() => listener.close());
  const link = TcpLink.to('127.0.0.1', listener.port, clock);
  return { link, visitors, listener, deserted: TcpLink.to('127.0.0.1', unused, clock) };
}

async function until(isReached: () => boolean): Promise<void> {
  const deadlineMs = clock.monotonicMs() + 5000;
  while (!isReached()) {
    if (clock.monotonicMs() > deadlineMs) throw new Error('not reached within 5 s');
    await clock.sleep(1);
  }
}

function gather(link: Link): { bytes: () => Buffer; closed: LinkClosed[] } {
  const pieces: Uint8Array[] = [];
  const closed: LinkClosed[] = [];
  link.received$.subscribe((piece) => pieces.push(Uint8Array.from(piece)));
  link.closed$.subscribe((news) => closed.push(news));
  return { bytes: () => Buffer.concat(pieces), closed };
}

async function openPair(wire: Wire): Promise<{ near: Link; far: Link }> {
  const before = wire.visitors.length;
  await wire.link.open();
  await until(() => wire.visitors.length > before);
  return { near: wire.link, far: wire.visitors.at(-1)! };
}

for (const { kind, build } of kinds) {
  describe(`Link: ${kind}`, () => {
    it('is closed until opened, and the visitor is open when it is handed over', async () => {
      const wire = await build();
      expect(wire.link.isOpen).toBe(false);
      const { near, far } = await openPair(wire);
      expect(near.isOpen).toBe(true);
      expect(far.isOpen).toBe(true);
      await near.close();
    });

    it('refuses to open where nobody listens', async () => {
      const wire = await build();
      const failure = await wire.deserted.open().catch((error: unknown) => error);
      expect(failure).toBeInstanceOf(DriverError);
      expect((failure as DriverError).code).toBe('LINK_OPEN_FAILED');
      expect(wire.deserted.isOpen).toBe(false);
    });

    it('does not open under an aborted signal', async () => {
      const wire = await build();
      const reason = new Error('not wanted');
      await expect(wire.link.open(AbortSignal.abort(reason))).rejects.toBe(reason);
      expect(wire.link.isOpen).toBe(false);
    });

    it('carries bytes both ways, whole and in order', async () => {
      const wire = await build();
      const { near, far } = await openPair(wire);
      const atNear = gather(near);
      const atFar = gather(far);
      for (let count = 0; count < 40; count += 1) {
        await near.write(Buffer.from(`question ${count}\n`));
        await far.write(Buffer.from(`answer ${count}\n`));
      }
      const expected = (what: string): string =>
        Array.from({ length: 40 }, (_, count) => `${what} ${count}\n`).join('');
      await until(() => atNear.bytes().length >= expected('answer').length);
      await until(() => atFar.bytes().length >= expected('question').length);
      expect(atFar.bytes().toString()).toBe(expected('question'));
      expect(atNear.bytes().toString()).toBe(expected('answer'));
      await near.close();
    });

    it('keeps order when nobody waits for a write', async () => {
      const wire = await build();
      const { near, far } = await openPair(wire);
      const atFar = gather(far);
      await Promise.all([1, 2, 3, 4, 5].map((byte) => near.write(Uint8Array.of(byte))));
      await until(() => atFar.bytes().length === 5);
      expect([...atFar.bytes()]).toEqual([1, 2, 3, 4, 5]);
      await near.close();
    });

    it('does not see what the writer does to the bytes afterwards', async () => {
      const wire = await build();
      const { near, far } = await openPair(wire);
      const atFar = gather(far);
      const bytes = Uint8Array.of(1, 2, 3);
      await near.write(bytes);
      bytes.fill(9);
      await until(() => atFar.bytes().length === 3);
      expect([...atFar.bytes()]).toEqual([1, 2, 3]);
      await near.close();
    });

    it('carries a block of one megabyte with every byte value', async () => {
      const wire = await build();
      const { near, far } = await openPair(wire);
      const atNear = gather(near);
      const block = Uint8Array.from({ length: 1_048_576 }, (_, index) => (index * 31 + (index >> 8)) & 0xff);
      await far.write(block);
      await until(() => atNear.closed.length > 0 || countOf(atNear) >= block.length);
      expect(Buffer.compare(atNear.bytes(), Buffer.from(block))).toBe(0);
      await near.close();
    });

    it('tells who closed: local here, remote there, once', async () => {
      const wire = await build();
      const { near, far } = await openPair(wire);
      const atNear = gather(near);
      const atFar = gather(far);
      await near.close();
      expect(near.isOpen).toBe(false);
      await until(() => atFar.closed.length > 0);
      expect(atNear.closed).toEqual([{ by: 'local' }]);
      expect(atFar.closed).toEqual([{ by: 'remote' }]);
      expect(far.isOpen).toBe(false);
      await near.close();
      await nextTurn();
      expect(atNear.closed).toHaveLength(1);
    });

    it('notices that the other side has closed, after the last bytes', async () => {
      const wire = await build();
      const { near, far } = await openPair(wire);
      const atNear = gather(near);
      await far.write(Buffer.from('goodbye'));
      await far.close();
      await until(() => atNear.closed.length > 0);
      expect(atNear.closed).toEqual([{ by: 'remote' }]);
      expect(atNear.bytes().toString()).toBe('goodbye');
    });

    it('refuses to write when it is not open', async () => {
      const wire = await build();
      const code = async (): Promise<unknown> =>
        wire.link.write(Uint8Array.of(1)).then(
          () => 'written',
          (error: unknown) => (error as DriverError).code,
        );
      expect(await code()).toBe('LINK_CLOSED');
      const { near } = await openPair(wire);
      await near.close();
      expect(await code()).toBe('LINK_CLOSED');
    });

    it('reopens after a close by either side, with the same streams', async () => {
      const wire = await build();
      const atNear = gather(wire.link);
      const first = await openPair(wire);
      await first.far.write(Buffer.from('one '));
      await until(() => atNear.bytes().length === 4);
      await first.near.close();
      const second = await openPair(wire);
      await second.far.write(Buffer.from('two '));
      await until(() => atNear.bytes().length === 8);
      await second.far.close();
      await until(() => atNear.closed.length === 2);
      const third = await openPair(wire);
      await third.far.write(Buffer.from('three'));
      await until(() => atNear.bytes().length === 13);
      expect(atNear.bytes().toString()).toBe('one two three');
      await third.near.close();
      expect(atNear.closed.map((news) => news.by)).toEqual(['local', 'remote', 'local']);
    });

    it('cannot reopen a visitor', async () => {
      const wire = await build();
      const { near, far } = await openPair(wire);
      await near.close();
      await until(() => !far.isOpen);
      const failure = await far.open().catch((error: unknown) => error);
      expect((failure as DriverError).code).toBe('LINK_OPEN_FAILED');
    });

    it('takes no more visitors once the listener has closed', async () => {
      const wire = await build();
      await wire.listener.close();
      const failure = await wire.link.open().catch((error: unknown) => error);
      expect((failure as DriverError).code).toBe('LINK_OPEN_FAILED');
    });
  });
}

function countOf(gathered: { bytes: () => Buffer }): number {
  return gathered.bytes().length;
}

describe('TcpLink', () => {
  it('reports a connection that was reset as closed by the other side or as failed, never as local', async () => {
    const wire = await buildTcp();
    const { near } = await openPair(wire);
    const atNear = gather(near);
    await wire.listener.close();
    await until(() => atNear.closed.length > 0);
    expect(['remote', 'error']).toContain(atNear.closed[0]!.by);
    expect(near.isOpen).toBe(false);
  });

  it('names its address, IPv6 in brackets', () => {
    expect(TcpLink.to('127.0.0.1', 5025, clock).name).toBe('tcp://127.0.0.1:5025');
    expect(TcpLink.to('::1', 5025, clock).name).toBe('tcp://[::1]:5025');
  });
});
