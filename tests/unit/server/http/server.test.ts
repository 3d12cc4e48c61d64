import http from 'node:http';
import net from 'node:net';
import { gunzipSync } from 'node:zlib';

import { afterEach, describe, expect, it } from 'vitest';

import { readEnv } from '#server/env.ts';
import { type AppHandler, createWebServer, type WebServer } from '#server/http/server.ts';
import { contentDisposition, sendStream } from '#server/send.ts';
import { createRecordingLog } from '#support/recording-log.ts';

let web: WebServer | undefined;
afterEach(async () => {
  await web?.drain(0);
  web = undefined;
});

async function serve(app: AppHandler, settings: Record<string, string> = {}) {
  const env = readEnv({ DATABASE_URL: 'postgres://a:b@127.0.0.1/x', SELVAGE_SESSION_SECRET: 'x'.repeat(32), PORT: '0', ...settings });
  const { log, entries } = createRecordingLog();
  web = createWebServer(app, env, log);
  const port = await web.listen();
  return { web, port, url: `http://127.0.0.1:${port}`, entries };
}

const text: AppHandler = (_request, response) => {
  response.writeHead(200, { 'content-type': 'text/plain' });
  response.end('x'.repeat(5000));
};

/** Astro's way of writing a response: chunk after chunk, without looking at what `write` returns. */
async function writeCarelessly(source: Response, response: http.ServerResponse): Promise<void> {
  response.writeHead(source.status, Object.fromEntries(source.headers));
  const reader = source.body!.getReader();
  response.on('close', () => void reader.cancel());
  for (let part = await reader.read(); !part.done; part = await reader.read()) response.write(part.value);
  response.end();
}

describe('createWebServer', () => {
  it('gives each request an id of its own, whatever the client sends, and logs it', async () => {
    const seen: unknown[] = [];
    const { url, entries } = await serve((request, response) => {
      seen.push(request.headers['x-request-id']);
      response.end();
    });
    const answer = await fetch(`${url}/a?token=hunter2`, { headers: { 'x-request-id': 'chosen-by-client' } });
    expect(answer.headers.get('x-request-id')).toMatch(/^[0-9a-f-]{36}$/);
    expect(seen).toEqual([answer.headers.get('x-request-id')]);
    await expect.poll(() => entries).toEqual([expect.objectContaining({ requestId: seen[0], method: 'GET', path: '/a', status: 200 })]);
  });

  it.each([
    ['0', undefined],
    ['1', '198.51.100.7'],
  ])('with SELVAGE_TRUST_PROXY=%s sees the forwarded address as %s', async (trust, expected) => {
    const seen: unknown[] = [];
    const { url } = await serve(
      (request, response) => {
        seen.push(request.headers['x-forwarded-for'], request.headers['x-forwarded-host'] !== undefined);
        response.end();
      },
      { SELVAGE_TRUST_PROXY: trust },
    );
    await fetch(url, { headers: { 'x-forwarded-for': '203.0.113.9, 198.51.100.7', 'x-forwarded-host': 'evil.example' } });
    expect(seen).toEqual([expected, trust === '1']);
  });

  it('compresses text, and neither event streams nor binary data', async () => {
    const { port } = await serve((request, response) => {
      response.writeHead(200, { 'content-type': request.url === '/events' ? 'text/event-stream' : request.url === '/binary' ? 'application/octet-stream' : 'text/plain' });
      response.end('x'.repeat(5000));
    });
    const get = (path: string) =>
      new Promise<{ encoding: string | undefined; body: Buffer }>((resolve) => {
        http.get({ port, path, headers: { 'accept-encoding': 'gzip' } }, (answer) => {
          const parts: Buffer[] = [];
          answer.on('data', (part: Buffer) => parts.push(part)).on('end', () => resolve({ encoding: answer.headers['content-encoding'], body: Buffer.concat(parts) }));
        });
      });
    const plain = await get('/text');
    expect(plain.encoding).toBe('gzip');
    expect(gunzipSync(plain.body).toString()).toBe('x'.repeat(5000));
    expect((await get('/events')).encoding).toBeUndefined();
    expect((await get('/binary')).encoding).toBeUndefined();
  });

  it('sends a policy without inline scripts with pages, and keeps what Astro put there', async () => {
    const { url } = await serve((request, response) => {
      response.writeHead(200, { 'content-type': 'text/html', ...(request.url === '/astro' && { 'content-security-policy': "script-src 'self' 'sha256-abc';" }) });
      response.end('<p>x');
    });
    const bare = (await fetch(url)).headers;
    expect(bare.get('content-security-policy')).toMatch(/default-src 'self'/);
    expect(bare.get('x-content-type-options')).toBe('nosniff');
    const policy = (await fetch(`${url}/astro`)).headers.get('content-security-policy') ?? '';
    expect(policy).toContain("script-src 'self' 'sha256-abc';");
    expect(policy.split(';').find((one) => one.trim().startsWith('script-src'))).not.toContain('unsafe-inline');
    expect(policy).toContain("style-src-attr 'unsafe-inline'");
  });

  it('refuses a body that says it is too large before reading it', async () => {
    let reached = false;
    const { port } = await serve(() => (reached = true), { SELVAGE_UPLOAD_LIMIT_MB: '2' });
    const refused = (type: string, length: number) =>
      new Promise<{ status: number | undefined; body: string }>((resolve, reject) => {
        const request = http.request({ port, method: 'POST', path: '/', headers: { 'content-type': type, 'content-length': length } }, (answer) => {
          let body = '';
          answer.on('data', (part: Buffer) => (body += part.toString())).on('end', () => resolve({ status: answer.statusCode, body }));
        });
        request.on('error', reject);
        request.flushHeaders();
      });
    expect(await refused('application/json', 1024 * 1024 + 1)).toMatchObject({ status: 413, body: expect.stringContaining('BODY_TOO_LARGE') });
    expect(await refused('multipart/form-data; boundary=x', 500 * 1024 * 1024)).toMatchObject({ status: 413, body: expect.stringContaining('500 MB, and at most 2 MB') });
    expect(reached).toBe(false);
  });

  it('answers a broken percent escape with 400', async () => {
    const { port } = await serve(text);
    const status = await new Promise((resolve) => http.get({ port, path: '/%zz' }, (answer) => resolve(answer.statusCode)));
    expect(status).toBe(400);
  });

  it('lets a request under way finish while draining, ends event streams, and refuses new connections', async () => {
    let release: (() => void) | undefined;
    const { web: server, url, port } = await serve(async (request, response) => {
      if (request.url === '/events') {
        response.writeHead(200, { 'content-type': 'text/event-stream' });
        response.write('data: 1\n\n');
        return;
      }
      await new Promise<void>((resolve) => (release = resolve));
      response.end('finished');
    });
    const events = await fetch(`${url}/events`);
    const slow = fetch(`${url}/slow`).then((answer) => answer.text());
    await expect.poll(() => release).toBeDefined();
    const drained = server.drain(5_000);
    expect(await events.text()).toBe('data: 1\n\n');
    const refusedConnection = await new Promise((resolve) => net.connect(port, '127.0.0.1').once('error', (error: NodeJS.ErrnoException) => resolve(error.code)).once('connect', () => resolve('connected')));
    expect(refusedConnection).toBe('ECONNREFUSED');
    release!();
    expect(await slow).toBe('finished');
    await drained;
  });

  it('cuts off at the end of the grace time what does not finish', async () => {
    const { web: server, url } = await serve(() => {});
    const never = fetch(url).then(
      () => 'answered',
      () => 'cut off',
    );
    await new Promise((resolve) => setTimeout(resolve, 50));
    await server.drain(100);
    expect(await never).toBe('cut off');
  });

  it('reads a streamed file no faster than a slow client takes it, and closes the source when the client leaves', async () => {
    const chunk = new Uint8Array(256 * 1024);
    let produced = 0;
    let isClosed = false;
    async function* source() {
      try {
        for (; produced < 400; produced += 1) {
          yield chunk;
          await new Promise((resolve) => setImmediate(resolve));
        }
      } finally {
        isClosed = true;
      }
    }
    const { port } = await serve((_request, response) => writeCarelessly(sendStream(source(), { mediaType: 'application/octet-stream' }), response));
    const socket = net.connect(port, '127.0.0.1');
    socket.write('GET / HTTP/1.1\r\nHost: x\r\n\r\n');
    await new Promise((resolve) => socket.once('data', resolve));
    socket.pause();
    await expect.poll(async () => {
      const before = produced;
      await new Promise((resolve) => setTimeout(resolve, 200));
      return produced - before;
    }, { timeout: 10_000 }).toBe(0);
    // 100 MB would have been read otherwise; the socket buffers of both ends hold a few.
    expect(produced).toBeLessThan(100);
    socket.destroy();
    await expect.poll(() => isClosed).toBe(true);
  });
});

describe('contentDisposition', () => {
  it('gives old clients an ASCII name and the exact one in UTF-8 (RFC 6266 section 4.3, RFC 8187)', () => {
    expect(contentDisposition('naïve "file"€.csv')).toBe(`attachment; filename="na_ve _file__.csv"; filename*=UTF-8''na%C3%AFve%20%22file%22%E2%82%AC.csv`);
  });
});
