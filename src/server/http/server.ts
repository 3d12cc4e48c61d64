import http, { type IncomingMessage, type ServerResponse } from 'node:http';

import compression from 'compression';

import type { Env } from '../env.ts';
import { AppError } from '../errors.ts';
import type { Logger } from '../log.ts';
import { withFlow } from './flow.ts';
import { prepareRequest, refusal, refuse } from './gate.ts';
import { addSecurityHeaders } from './security-headers.ts';

/** Astro's standalone handler: static files, then pages and endpoints. */
export type AppHandler = (request: IncomingMessage, response: ServerResponse) => unknown;

export interface WebServer {
  /** Listens. Returns the port. */
  listen(): Promise<number>;
  /** Takes no new requests, lets those under way finish for at most `graceMs`, ends event streams at once. */
  drain(graceMs: number): Promise<void>;
}

/** The HTTP server around `app`: request ids, limits, security headers, compression, back-pressure, access log, draining. */
export function createWebServer(app: AppHandler, env: Env, log: Logger): WebServer {
  const compress = compression({ threshold: 1024, filter: isCompressible });
  const active = new Set<ServerResponse>();
  let isDraining = false;
  const server = http.createServer((request, response) => {
    const started = performance.now();
    const requestId = prepareRequest(request, env);
    response.setHeader('x-request-id', requestId);
    active.add(response);
    response.once('close', () => {
      active.delete(response);
      logAccess(log, request, response, requestId, performance.now() - started);
    });
    if (isDraining) response.setHeader('connection', 'close');
    addSecurityHeaders(response, env.baseUrl?.startsWith('https:') ?? false);
    const error = isDraining && request.url === '/readyz' ? new AppError('UNAVAILABLE', 'The server is shutting down. Ask another one.') : refusal(request, env);
    if (error !== undefined) return refuse(response, error, requestId);
    compress(request as never, response as never, () => withFlow(response, () => answer(app, request, response, requestId, log)));
  });
  // Uploads may be slow; a head may not.
  server.headersTimeout = 20_000;
  server.requestTimeout = 30 * 60_000;
  server.keepAliveTimeout = 65_000;
  return {
    listen: () =>
      new Promise((resolve, reject) => {
        server.once('error', reject);
        server.listen(env.port, env.host, () => {
          const address = server.address();
          resolve(typeof address === 'object' && address !== null ? address.port : env.port);
        });
      }),
    drain(graceMs) {
      isDraining = true;
      return new Promise((resolve) => {
        const last = setTimeout(() => server.closeAllConnections(), graceMs);
        server.close(() => {
          clearTimeout(last);
          resolve();
        });
        server.closeIdleConnections();
        for (const response of active) if (isEventStream(response)) response.end();
      });
    },
  };
}

async function answer(app: AppHandler, request: IncomingMessage, response: ServerResponse, requestId: string, log: Logger): Promise<void> {
  try {
    await app(request, response);
  } catch (error) {
    log.error({ err: error, requestId }, 'Request failed outside an endpoint');
    if (response.headersSent) response.destroy();
    else refuse(response, new AppError('INTERNAL', `Something failed on the server. Try again; if it fails again, tell your administrator and quote request ${requestId}.`), requestId);
  }
}

const isEventStream = (response: ServerResponse) => String(response.getHeader('content-type') ?? '').startsWith('text/event-stream');

/** Text only: arrays of numbers gain little for much processor time. */
function isCompressible(request: IncomingMessage, response: ServerResponse): boolean {
  const isBinary = String(response.getHeader('content-type') ?? '').startsWith('application/octet-stream');
  return !isEventStream(response) && !isBinary && compression.filter(request as never, response as never);
}

function logAccess(log: Logger, request: IncomingMessage, response: ServerResponse, requestId: string, ms: number): void {
  const path = (request.url ?? '').split('?')[0] ?? '';
  const facts = { requestId, method: request.method, path, status: response.statusCode, ms: Math.round(ms * 10) / 10 };
  const isQuiet = path.startsWith('/_astro/') || path === '/healthz' || path === '/readyz';
  if (!response.writableFinished) log.info({ ...facts, aborted: true }, 'Client left');
  else if (response.statusCode >= 500) log.error(facts, 'Answered');
  else log[isQuiet ? 'debug' : 'info'](facts, 'Answered');
}
