import { describe, expect, it } from 'vitest';
import { z } from 'zod/v4';

import { NumericalError } from '#core/errors.ts';
import { problemSchema } from '#schemas/problem.ts';
import { AppError, notFound } from '#server/errors.ts';
import { handle, parseBody, parseQuery, respondJson } from '#server/respond.ts';
import { createRecordingLog } from '#support/recording-log.ts';

const schema = z.strictObject({ name: z.string().min(1), size: z.number().positive() });

async function answerOf(run: (request: Request) => Response | Promise<Response>, init?: RequestInit) {
  const { log, entries } = createRecordingLog();
  const request = new Request('http://localhost/api/v1/things', init);
  const response = await handle(({ request: given }: { request: Request; locals: object }) => run(given))({ request, locals: { ctx: { requestId: 'req-1', log } } });
  return { response, body: (await response.json()) as Record<string, unknown>, entries };
}

const post = (body: BodyInit, type = 'application/json'): RequestInit => ({ method: 'POST', body, headers: { 'content-type': type } });
const readBody = async (request: Request) => respondJson(await parseBody(request, schema));

describe('handle', () => {
  it('answers an AppError as problem details of RFC 9457 with its code, status and request id', async () => {
    const { response, body } = await answerOf(() => {
      throw notFound('study');
    });
    expect(response.status).toBe(404);
    // RFC 9457 section 3 and 6.1: the media type and the members.
    expect(response.headers.get('content-type')).toBe('application/problem+json');
    expect(problemSchema.parse(body)).toMatchObject({ type: 'about:blank', title: 'Not found', status: 404, code: 'NOT_FOUND', requestId: 'req-1' });
  });

  it('answers a NumericalError as 422 with its own code and facts', async () => {
    const { response, body } = await answerOf(() => {
      throw new NumericalError('POINTS_COLLINEAR', 'All the points lie on one line. Add a point off that line.', { details: { points: 3 } });
    });
    expect(response.status).toBe(422);
    expect(body).toMatchObject({ code: 'POINTS_COLLINEAR', details: { points: 3 } });
  });

  it('logs an unknown error whole and tells nothing of it', async () => {
    const { response, body, entries } = await answerOf(() => {
      throw new Error('relation "secret_table" does not exist');
    });
    expect(response.status).toBe(500);
    expect(JSON.stringify(body)).not.toContain('secret_table');
    expect(body['detail']).toContain('req-1');
    expect(entries).toEqual([expect.objectContaining({ level: 'error', requestId: 'req-1', err: expect.objectContaining({ message: expect.stringContaining('secret_table'), stack: expect.any(String) }) })]);
  });

  it('passes on the headers that an error asks for', async () => {
    const { response } = await answerOf(() => {
      throw new AppError('RATE_LIMITED', 'Too many attempts. Wait a minute.', { headers: { 'retry-after': '60' } });
    });
    expect(response.headers.get('retry-after')).toBe('60');
  });
});

describe('parseBody', () => {
  it('returns what the schema makes of the body', async () => {
    const { body } = await answerOf(readBody, post('{"name":"a","size":2}'));
    expect(body).toEqual({ name: 'a', size: 2 });
  });

  it('names every wrong field', async () => {
    const { response, body } = await answerOf(readBody, post('{"name":"","size":-1,"other":1}'));
    expect(response.status).toBe(422);
    expect(body['code']).toBe('VALIDATION_FAILED');
    expect((body['fields'] as { path: string }[]).map((field) => field.path)).toEqual(expect.arrayContaining(['name', 'size']));
  });

  it.each([
    ['no JSON', post('{"name":'), 400, 'BODY_NOT_JSON'],
    ['an empty body', post(''), 400, 'BODY_NOT_JSON'],
    ['invalid UTF-8', post(new Uint8Array([0x22, 0xff, 0x22])), 400, 'BODY_NOT_JSON'],
    ['a form', post('name=a', 'application/x-www-form-urlencoded'), 415, 'MEDIA_TYPE_UNSUPPORTED'],
    ['more than a mebibyte', post(`"${'x'.repeat(1024 * 1024)}"`), 413, 'BODY_TOO_LARGE'],
  ])('refuses %s', async (_what, init, status, code) => {
    const { response, body } = await answerOf(readBody, init);
    expect([response.status, body['code']]).toEqual([status, code]);
  });

  it('stops reading a body of unknown length at the limit', async () => {
    let given = 0;
    const endless = new ReadableStream<Uint8Array>({
      pull(controller) {
        given += 64 * 1024;
        controller.enqueue(new Uint8Array(64 * 1024).fill(0x20));
      },
    });
    const { response } = await answerOf(readBody, { ...post(endless), duplex: 'half' } as RequestInit);
    expect(response.status).toBe(413);
    expect(given).toBeLessThan(2 * 1024 * 1024);
  });
});

describe('parseQuery', () => {
  it('coerces and checks', () => {
    const query = z.object({ limit: z.coerce.number().int().max(10).default(5) });
    expect(parseQuery(new URL('http://x/?limit=7'), query)).toEqual({ limit: 7 });
    expect(() => parseQuery(new URL('http://x/?limit=11'), query)).toThrow(AppError);
  });
});
