import { createServer, type IncomingMessage, type Server, type ServerResponse } from 'node:http';
import type { AddressInfo } from 'node:net';
import { bounds } from '../bounds.ts';
import { createSettleApp, failurePage, finishAll, type SettleApp, type SettleDeps } from './settle-app.ts';
import { signTicket } from './ticket.ts';

export interface SettleServer {
  /** Where one person comes in, once. */
  linkFor(by: string): string;
  readonly origin: string;
  /** Ends the server; what could still be taken back is dropped for good. */
  close(): Promise<void>;
}

const host = '127.0.0.1';

/** Serves the page on this machine only. `port` 0: any that is free. Rejects when the port is taken. */
export async function startSettleServer(
  deps: Omit<SettleDeps, 'origin' | 'base'>,
  port = 0,
): Promise<SettleServer> {
  let app: SettleApp | null = null;
  let origin = '';
  const server = createServer((request, response) => void serve(app, origin, request, response));
  server.requestTimeout = 30_000;
  await listen(server, port);
  origin = `http://${host}:${(server.address() as AddressInfo).port}`;
  app = createSettleApp({ ...deps, origin, base: '' });
  return {
    origin,
    linkFor(by) {
      const untilMs = deps.world.nowMs() + bounds.settleLinkMs;
      const about = Math.floor(deps.world.random() * 2 ** 52).toString(36);
      return `${origin}/enter?t=${signTicket(deps.ticketKey, { purpose: 'enter', by, untilMs, about })}`;
    },
    async close() {
      server.closeAllConnections();
      await new Promise<void>((resolve) => server.close(() => resolve()));
      await finishAll(deps, null);
    },
  };
}

function listen(server: Server, port: number): Promise<void> {
  return new Promise((resolve, reject) => {
    server.once('error', reject);
    server.listen(port, host, () => {
      server.off('error', reject);
      resolve();
    });
  });
}

async function serve(
  app: SettleApp | null,
  origin: string,
  request: IncomingMessage,
  response: ServerResponse,
): Promise<void> {
  const answer = await answerTo(app, origin, request).catch((error: unknown) => failurePage('', error));
  response.writeHead(answer.status, answer.headers);
  response.end(answer.body);
}

async function answerTo(app: SettleApp | null, origin: string, request: IncomingMessage) {
  // A page elsewhere may point a name of its own at this machine: only our own address is answered (DNS rebinding).
  if (app === null || `http://${request.headers.host}` !== origin)
    return { status: 421, headers: {}, body: '' };
  const url = new URL(request.url ?? '/', origin);
  const body: Buffer[] = [];
  let bytes = 0;
  for await (const chunk of request as AsyncIterable<Buffer>) {
    bytes += chunk.length;
    if (bytes > bounds.settleBodyBytesMax) return { status: 413, headers: { connection: 'close' }, body: '' };
    body.push(chunk);
  }
  return app({
    method: request.method ?? 'GET',
    path: url.pathname,
    query: url.searchParams,
    headers: request.headers as Record<string, string | undefined>,
    body: Buffer.concat(body),
  });
}
