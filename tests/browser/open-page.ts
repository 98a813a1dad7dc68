// The built page in a real browser: builds and serves it, opens it at a size and colour scheme, and keeps
// what went wrong there and every address that was asked for.
import { existsSync } from 'node:fs';
import { mkdtemp, rm } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { type Browser, chromium, type Page } from 'playwright-core';
import { build } from 'vite';
import { type StaticServer, serveFolder } from '../support/static-server.ts';

const executablePath = '/usr/bin/chromium';

/** One line where the browser is missing. */
export const missingBrowser = existsSync(executablePath)
  ? undefined
  : `${executablePath} is missing (on Debian: apt install chromium)`;

export interface OpenPage {
  page: Page;
  /** Errors and warnings of the console, and exceptions. */
  complaints: string[];
  /** Every address the page asked for; those off the server were refused. */
  requested: string[];
}

export interface PageOptions {
  width?: number;
  height?: number;
  colorScheme?: 'light' | 'dark';
}

export class PageBench {
  readonly url: string;
  readonly folder: string;
  readonly #server: StaticServer;
  readonly #browser: Browser;

  private constructor(folder: string, server: StaticServer, browser: Browser) {
    this.folder = folder;
    this.url = server.url;
    this.#server = server;
    this.#browser = browser;
  }

  static async start(): Promise<PageBench> {
    const folder = await mkdtemp(join(tmpdir(), 'nightcut-page-'));
    const outDir = join(folder, 'built');
    await build({ logLevel: 'warn', build: { outDir, emptyOutDir: true } });
    const server = await serveFolder(outDir);
    const browser = await chromium.launch({
      executablePath,
      args: [
        '--headless',
        '--no-sandbox',
        '--disable-gpu',
        '--disable-quic',
        '--no-first-run',
        '--disable-background-networking',
        '--disable-component-update',
        '--disable-sync',
        '--host-resolver-rules=MAP * ~NOTFOUND, EXCLUDE 127.0.0.1',
      ],
    });
    console.info(`page tests in Chromium ${browser.version()}`);
    return new PageBench(folder, server, browser);
  }

  async open(options: PageOptions = {}): Promise<OpenPage> {
    const { width = 1280, height = 800, colorScheme = 'light' } = options;
    const context = await this.#browser.newContext({ viewport: { width, height }, colorScheme });
    const complaints: string[] = [];
    const requested: string[] = [];
    await context.route('**/*', (route) => {
      const url = route.request().url();
      requested.push(url);
      return url.startsWith(this.url) ? route.continue() : route.abort();
    });
    await context.routeWebSocket(/.*/, (socket) => {
      requested.push(socket.url());
    });
    const page = await context.newPage();
    page.setDefaultTimeout(10_000);
    page.on('console', (message) => {
      if (message.type() === 'error' || message.type() === 'warning') complaints.push(message.text());
    });
    page.on('pageerror', (error) => complaints.push(error.message));
    await page.goto(this.url);
    return { page, complaints, requested };
  }

  async close(): Promise<void> {
    await this.#browser.close();
    await this.#server.close();
    await rm(this.folder, { recursive: true, force: true });
  }
}
