/**
 * Serves the built page to this machine only: loopback address, the page's own files and nothing else, a
 * strict content policy, no caching of the document. The list of files is read once, so no request ever
 * reaches the file system.
 */
import { readdirSync, readFileSync, statSync } from 'node:fs';
import { createServer, type IncomingMessage, type ServerResponse } from 'node:http';
import type { AddressInfo } from 'node:net';
import { extname, join, relative, sep } from 'node:path';
import { fileURLToPath } from 'node:url';
import { InputError } from '../input-error.ts';

export type DeskOptions = {
  /** 0 or nothing: any free port. */
  port?: number;
  /** Where the built page is; by default beside the command. */
  directory?: string;
};

export type Desk = { url: string; close: () => Promise<void> };

export const CONTENT_POLICY = [
  "default-src 'none'",
  "script-src 'self' 'wasm-unsafe-eval'",
  "style-src 'self'",
  "img-src 'self' data: blob:",
  "worker-src 'self'",
  "connect-src 'self'",
  "base-uri 'none'",
  "form-action 'none'",
  "frame-ancestors 'none'",
].join('; ');

const HOST = '127.0.0.1';

const TYPES: Readonly<Record<string, string>> = {
  '.html': 'text/html; charset=utf-8',
  '.js': 'text/javascript; charset=utf-8',
  '.css': 'text/css; charset=utf-8',
  '.svg': 'image/svg+xml',
  '.wasm': 'application/wasm',
};

type Page = { body: Buffer; type: string };

/** Starts the server. Throws InputError when the page is not built or the port is taken. */
export async function startDesk({ port = 0, directory }: DeskOptions = {}): Promise<Desk> {
  const files = readPages(directory ?? fileURLToPath(new URL('./desk', import.meta.url)));
  let hosts: ReadonlySet<string> = new Set();
  const server = createServer((request, response) => respond(request, response, files, hosts));
  server.headersTimeout = 10_000;
  await new Promise<void>((resolve, reject) => {
    server.once('error', (error: NodeJS.ErrnoException) => {
      const isTaken = error.code === 'EADDRINUSE' || error.code === 'EACCES';
      reject(
        isTaken
          ? new InputError({
              code: 'port-taken',
              message: `expected a free port, got ${port} (${error.code})`,
              hint: 'use --port 0 for any free port',
            })
          : error,
      );
    });
    server.listen(port, HOST, resolve);
  });
  const { port: found } = server.address() as AddressInfo; // it listens on an address, not on a pipe
  // a page elsewhere that lets its own name point here must not be answered
  hosts = new Set([`${HOST}:${found}`, `localhost:${found}`]);
  return {
    url: `http://${HOST}:${found}/`,
    close: () =>
      new Promise((resolve) => {
        server.close(() => resolve());
        server.closeAllConnections();
      }),
  };
}

function readPages(directory: string): ReadonlyMap<string, Page> {
  const files = new Map<string, Page>();
  const visit = (folder: string): void => {
    for (const name of readdirSync(folder)) {
      const path = join(folder, name);
      if (statSync(path).isDirectory()) visit(path);
      else {
        const address = `/${relative(directory, path).split(sep).join('/')}`;
        const type = TYPES[extname(name)] ?? 'application/octet-stream';
        files.set(address, { body: readFileSync(path), type });
      }
    }
  };
  try {
    visit(directory);
  } catch (error) {
    const code = (error as NodeJS.ErrnoException).code ?? 'unknown';
    throw new InputError({
      code: 'missing-desk',
      message: `missing page: expected it built in ${directory}, got ${code}`,
      hint: 'run npm run build',
    });
  }
  const index = files.get('/index.html');
  if (!index) {
    throw new InputError({
      code: 'missing-desk',
      message: `missing page: no index.html in ${directory}`,
      hint: 'run npm run build',
    });
  }
  return files.set('/', index);
}

function respond(
  request: IncomingMessage,
  response: ServerResponse,
  files: ReadonlyMap<string, Page>,
  hosts: ReadonlySet<string>,
): void {
  const end = (status: number, text: string): void => {
    response.writeHead(status, { 'content-type': 'text/plain; charset=utf-8', ...SAFE });
    response.end(request.method === 'HEAD' ? undefined : text);
  };
  if (!hosts.has(request.headers.host ?? '')) {
    end(421, 'not this host\n');
    return;
  }
  if (request.method !== 'GET' && request.method !== 'HEAD') {
    end(405, 'only GET\n');
    return;
  }
  const path = (request.url ?? '/').split(/[?#]/)[0] ?? '/';
  const page = files.get(path);
  if (!page) {
    end(404, 'no such file\n');
    return;
  }
  const isNamedByContent = path.startsWith('/assets/');
  response.writeHead(200, {
    'content-type': page.type,
    'content-length': page.body.length,
    'cache-control': isNamedByContent ? 'max-age=31536000, immutable' : 'no-cache',
    ...SAFE,
  });
  response.end(request.method === 'HEAD' ? undefined : page.body);
}

const SAFE = {
  'content-security-policy': CONTENT_POLICY,
  'x-content-type-options': 'nosniff',
  'referrer-policy': 'no-referrer',
  'cross-origin-opener-policy': 'same-origin',
  'cross-origin-resource-policy': 'same-origin',
} as const;
