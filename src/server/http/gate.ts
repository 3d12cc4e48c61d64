import { randomUUID } from 'node:crypto';
import type { IncomingMessage, ServerResponse } from 'node:http';

import type { Env } from '../env.ts';
import { AppError } from '../errors.ts';
import { JSON_BODY_LIMIT, toProblem } from '../respond.ts';

/** Room for the multipart frame around an uploaded file. */
const MULTIPART_FRAME = 1024 * 1024;

/**
 * Gives the request its id and drops forwarded headers that nobody vouches for.
 * Behind a trusted proxy the client's address is the last entry of X-Forwarded-For: the one that the proxy wrote.
 */
export function prepareRequest(request: IncomingMessage, env: Pick<Env, 'trustProxy'>): string {
  const { headers } = request;
  const given = headers['x-request-id'];
  const requestId = env.trustProxy && typeof given === 'string' && /^[\w.-]{8,100}$/.test(given) ? given : randomUUID();
  headers['x-request-id'] = requestId;
  if (env.trustProxy) {
    const chain = headers['x-forwarded-for'];
    const last = (Array.isArray(chain) ? chain.join(',') : chain)?.split(',').at(-1)?.trim();
    if (last) headers['x-forwarded-for'] = last;
  } else {
    for (const name of ['x-forwarded-for', 'x-forwarded-host', 'x-forwarded-proto', 'x-forwarded-port']) delete headers[name];
  }
  return requestId;
}

/** Why the request is refused before any of it is read, or undefined. Bodies of unknown length are counted by whoever reads them. */
export function refusal(request: IncomingMessage, env: Pick<Env, 'uploadLimitBytes'>): AppError | undefined {
  try {
    decodeURI(request.url ?? '/');
  } catch {
    return new AppError('BAD_REQUEST', 'The address has a percent sign that is not followed by two hexadecimal digits. Write it as %25.');
  }
  const isUpload = /^multipart\/form-data\b/i.test(request.headers['content-type'] ?? '');
  const limit = isUpload ? env.uploadLimitBytes + MULTIPART_FRAME : JSON_BODY_LIMIT;
  const length = Number(request.headers['content-length'] ?? 0);
  if (length <= limit) return undefined;
  const size = (bytes: number) => `${Math.round((bytes / 1024 / 1024) * 10) / 10} MB`;
  return new AppError(
    'BODY_TOO_LARGE',
    isUpload
      ? `The file is too large: ${size(length)}, and at most ${size(env.uploadLimitBytes)} are taken. Split it, or leave out columns and rows that are not needed.`
      : `The body is too large: ${size(length)}, and at most ${size(limit)} are taken here. Send less in one request.`,
    { details: { limitBytes: isUpload ? env.uploadLimitBytes : limit, givenBytes: length } },
  );
}

/** Answers with problem details outside Astro, and closes the connection so that an unread body is not waited for. */
export function refuse(response: ServerResponse, error: AppError, requestId: string): void {
  const { problem, headers } = toProblem(error, requestId);
  const body = JSON.stringify(problem);
  response.writeHead(problem.status, {
    'content-type': 'application/problem+json',
    'content-length': Buffer.byteLength(body),
    'cache-control': 'no-store',
    connection: 'close',
    ...headers,
  });
  response.end(body);
}
