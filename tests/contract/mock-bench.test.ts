// The bench over real sockets, met by a bare TCP client, and the command line around it: what it prints, what
// it obeys, how it ends.
import { createConnection, createServer, type Socket } from 'node:net';
import { PassThrough } from 'node:stream';
import { afterEach, describe, expect, it } from 'vitest';
import { SystemClock } from '../../drivers/clock.ts';
import { runMockCommandLine } from '../../mocks/command-line.ts';

class Client {
  heard = '';
  readonly #socket: Socket;
  isClosed = false;

  constructor(port: number) {
    this.#socket = createConnection({ host: '127.0.0.1', port });
    this.#socket.on('data', (bytes) => {
      this.heard += bytes.toString('latin1');
    });
    // A reset by the other end is a way of closing here.
    this.#socket.on('error', () => {});
    this.#socket.on('close', () => {
      this.isClosed = true;
    });
  }

  get isConnected(): boolean {
    return !this.#socket.connecting;
  }

  async ask(text: string, answer: RegExp): Promise<string> {
    const from = this.heard.length;
    this.#socket.write(text);
    await until(() => answer.test(this.heard.slice(from)));
    return this.heard.slice(from);
  }

  end(): void {
    this.#socket.destroy();
  }
}

async function until(isReached: () => boolean): Promise<void> {
  const startMs = Date.now();
  while (!isReached()) {
    if (Date.now() - startMs > 10_000) throw new Error('not reached within 10 s');
    await new Promise((resolve) => setTimeout(resolve, 5));
  }
}

interface Session {
  stdin: PassThrough;
  out: () => string;
  err: () => string;
  stop: () => void;
  code: Promise<number>;
}

const sessions: Session[] = [];

afterEach(async () => {
  for (const session of sessions.splice(0)) {
    session.stop();
    await session.code;
  }
});

function run(...args: string[]): Session {
  let out = '';
  let err = '';
  let stop = (): void => {};
  const stdin = new PassThrough();
  const code = runMockCommandLine(args, {
    clock: new SystemClock(),
    stdin,
    stdout: { write: (text) => (out += text) },
    stderr: { write: (text) => (err += text) },
    onStopSignal: (asked) => {
      stop = asked;
      return () => {
        stop = () => {};
      };
    },
  });
  const session = { stdin, out: () => out, err: () => err, stop: () => stop(), code };
  sessions.push(session);
  return session;
}

async function served(...more: string[]): Promise<Session & { analyzer: Client; positioner: Client }> {
  const session = run('serve', '--json', '--analyzer-port', '0', '--positioner-port', '0', ...more);
  await until(() => session.out().includes('\n'));
  const ports = JSON.parse(session.out().split('\n')[0]!);
  const analyzer = new Client(ports.analyzer.port);
  const positioner = new Client(ports.positioner.port);
  await until(() => analyzer.isConnected && positioner.isConnected);
  // The controller boots for 25 ms and hears nothing meanwhile.
  await new Promise((resolve) => setTimeout(resolve, 60));
  return { ...session, analyzer, positioner };
}

describe('nightcut-mock serve', () => {
  it.each([
    ['named-measurement', 'CALC:PAR:CAT?', '"FIRST,S11"'],
    ['selected-trace', 'CALC:MEAS1:DEF?', '"S11"'],
  ])('speaks the commands of %s', async (dialect, question, answer) => {
    const { analyzer } = await served('--analyzer', dialect);
    expect(await analyzer.ask(`${question}\n`, /\n$/)).toContain(answer);
  });

  it('moves for a bare client and tells the truth about arrival', async () => {
    const { positioner, code, stdin } = await served('--accelerate', '20');
    await positioner.ask('\n', /ok\r\n$/);
    await positioner.ask('G90 G1 X30 F1200\n', /ok\r\n$/);
    await positioner.ask('G4 P0.01\n', /ok\r\n$/);
    expect(await positioner.ask('?', />\r\n$/)).toContain('<Idle|MPos:30.000,0.000,0.000|');
    await positioner.ask('G1 X-30 F1200\n', /ok\r\n$/);
    let report = await positioner.ask('!?', />\r\n$/);
    for (let tries = 0; tries < 50 && !report.includes('<Hold:0|'); tries += 1) {
      report = await positioner.ask('?', />\r\n$/);
    }
    const held = Number(/<Hold:0\|MPos:(-?[\d.]+)/.exec(report)?.[1]);
    expect(held).toBeGreaterThan(-30);
    expect(held).toBeLessThanOrEqual(30);
    stdin.write('quit\n');
    expect(await code).toBe(0);
    await until(() => positioner.isClosed);
  });

  it('takes the time it should: 20° at 20°/s and 40°/s², ten times faster', async () => {
    const { positioner } = await served('--accelerate', '10');
    await positioner.ask('\n', /ok\r\n$/);
    const startMs = Date.now();
    await positioner.ask('G0 X20\nG4 P0\n', /ok\r\nok\r\n$/);
    // 1 s + 0.5 s, a tenth of it.
    expect(Date.now() - startMs).toBeGreaterThan(145);
    expect(Date.now() - startMs).toBeLessThan(1500);
    positioner.end();
  });

  it('lets both devices be spoken to, and the mast be changed, while it runs', async () => {
    const { analyzer, stdin, out } = await served();
    expect(await analyzer.ask('*IDN?\n', /\n$/)).toMatch(/^[^,]+,[^,]+,[^,]+,[^,]+\r?\n$/);
    stdin.write('mount reference\ntruth\n');
    await until(() => out().split('\n').length >= 4);
    const [, mounted, truth] = out().split('\n');
    expect(JSON.parse(mounted!)).toEqual({ done: 'reference is on the mast' });
    expect(JSON.parse(truth!).data.mounted).toBe('reference');
  });

  it('strikes faults by name, lists them, and refuses what it does not know', async () => {
    const { positioner, stdin, out } = await served();
    await positioner.ask('\n', /ok\r\n$/);
    stdin.write('fault restart\nfault gremlins\ndance\nmount piano\nfaults\n');
    await until(() => positioner.heard.includes('for help]'));
    await until(() => out().split('\n').length >= 7);
    const [, struck, gremlins, dance, piano, list] = out()
      .split('\n')
      .map((line) => (line ? JSON.parse(line) : undefined));
    expect(struck).toEqual({ done: 'restart has struck' });
    expect([gremlins, dance, piano].every((answer) => typeof answer.refused === 'string')).toBe(true);
    expect(list.data.map((entry: { name: string }) => entry.name)).toContain('step-loss');
  });

  it('ends on a stop signal and closes its ports', async () => {
    const { positioner, stop, code } = await served();
    stop();
    expect(await code).toBe(0);
    await until(() => positioner.isClosed);
  });

  it('goes on after the end of input: a bench in the background has none', async () => {
    const { analyzer, stdin } = await served();
    stdin.end();
    await new Promise((resolve) => setTimeout(resolve, 100));
    expect(await analyzer.ask('*IDN?\n', /\n$/)).toContain(',');
  });

  it('says in one line that a port is taken, with exit code 3', async () => {
    const blocker = createServer();
    await new Promise<void>((resolve) => void blocker.listen(0, '127.0.0.1', resolve));
    const address = blocker.address();
    const port = typeof address === 'object' && address ? address.port : 0;
    const session = run('serve', '--analyzer-port', '0', '--positioner-port', String(port));
    expect(await session.code).toBe(3);
    expect(session.err()).toMatch(/^nightcut-mock: cannot listen on [^\n]*\n$/);
    blocker.close();
  });
});

describe('nightcut-mock usage', () => {
  const mistakes: string[][] = [
    [],
    ['blub'],
    ['serve', '--what'],
    ['serve', 'more'],
    ['serve', '--antenna', 'broomstick'],
    ['serve', '--analyzer', 'hand-made'],
    ['serve', '--analyzer-port', '70000'],
    ['serve', '--accelerate', '0'],
    ['serve', '--seed', 'x'],
    ['truth', '--band', '900,800'],
    ['truth', '--at', 'x'],
  ];
  for (const args of mistakes) {
    it(`refuses '${args.join(' ')}' in one line with exit code 2`, async () => {
      const session = run(...args);
      expect(await session.code).toBe(2);
      expect(session.err()).toMatch(/^nightcut-mock: [^\n]+\n$/);
      expect(session.out()).toBe('');
    });
  }

  it('prints help with exit code 0', async () => {
    const session = run('serve', '--help');
    expect(await session.code).toBe(0);
    expect(session.out()).toContain('--gear-play');
  });
});

describe('nightcut-mock truth', () => {
  it('prints the figures of a turned antenna as JSON', async () => {
    const session = run('truth', '--antenna', 'half-wave-dipole', '--at', '868', '900', '--band', '850,900');
    expect(await session.code).toBe(0);
    const truth = JSON.parse(session.out());
    expect(truth.frequencies.map((entry: { frequencyHz: number }) => entry.frequencyHz)).toEqual([
      868e6, 900e6,
    ]);
    // A thin half-wave dipole: 78.1° between half-power points, 2.15 dBi (textbook; Balanis, Antenna Theory, 4.6).
    expect(truth.frequencies[0].elevation.halfPowerBeamwidthDeg).toBeCloseTo(78.1, 0);
    expect(truth.frequencies[0].gainDbi).toBeCloseTo(2.15, 2);
    // A perfect match has no finite return loss.
    expect(truth.frequencies[0].returnLossDb).toEqual({ kind: 'absent', because: expect.any(String) });
  });

  it('turns the peak with --rotate', async () => {
    const session = run('truth', '--rotate', '-12.5');
    await session.code;
    expect(JSON.parse(session.out()).frequencies[0].azimuth.peakDeg).toBeCloseTo(-12.5, 1);
  });
});
