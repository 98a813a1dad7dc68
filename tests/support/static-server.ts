// A folder over HTTP on the loopback interface: just enough to open the built page as an operator would.
import { readFile } from 'node:fs/promises';
import { createServer } from 'node:http';
import type { AddressInfo } from 'node:net';
import { extname, join, normalize } from 'node:path';

export interface StaticServer {
  /** Ends in a slash. */
  url: string;
  close(): Promise<void>;
}

const mediaTypes: Readonly<Record<string, string>> = {
  '.html': 'text/html; charset=utf-8',
  '.js': 'text/javascript',
  '.css': 'text/css',
};

export async function serveFolder(folder: string): Promise<StaticServer> {
  const server = createServer((request, response) => {
    // Normalized below the root first, so that no address leads out of the folder.
    const { pathname } = new URL(request.url ?? '/', 'http://localhost');
    const path = normalize(pathname.endsWith('/') ? `${pathname}index.html` : pathname);
    readFile(join(folder, path)).then(
      (content) => {
        response.writeHead(200, { 'content-type': mediaTypes[extname(path)] ?? 'application/octet-stream' });
        response.end(content);
      },
      () => response.writeHead(404).end(),
    );
  });
  await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));
  return {
    url: `http://127.0.0.1:${(server.address() as AddressInfo).port}/`,
    close: () =>
      new Promise((resolve) => {
        server.close(() => resolve());
        server.closeAllConnections();
      }),
  };
}
