import { z } from 'zod/v4';

import { NumericalError } from '#core/errors.ts';
import type { Problem } from '#schemas/problem.ts';

import { AppError, type FieldProblem, NUMERICAL_STATUS, TITLE_BY_STATUS } from './errors.ts';
import { getLog, type Logger } from './log.ts';

/** Most JSON bodies are a few kilobytes; a recipe with large polygons is the exception. */
export const JSON_BODY_LIMIT = 1024 * 1024;

/** What `handle` needs of an endpoint's context; Astro's APIContext has it. */
export interface EndpointContext {
  request: Request;
  locals: object;
}

/**
 * Wraps an endpoint: whatever it throws becomes problem details with the request's id.
 * `export const GET: APIRoute = handle(async ({ locals, params }) => respondJson(await getStudy(locals.ctx, params.studyId)));`
 */
export function handle<C extends EndpointContext>(endpoint: (context: C) => Response | Promise<Response>): (context: C) => Promise<Response> {
  return async (context) => {
    try {
      return await endpoint(context);
    } catch (error) {
      return respondProblem(error, context);
    }
  };
}

/** A JSON answer; 200 unless said otherwise. API answers are private and never cached unless `headers` say so. */
export function respondJson(body: unknown, init: { status?: number; headers?: Record<string, string> } = {}): Response {
  return new Response(JSON.stringify(body), {
    status: init.status ?? 200,
    headers: { 'content-type': 'application/json; charset=utf-8', 'cache-control': 'no-store', ...init.headers },
  });
}

/** 204. */
export function respondEmpty(): Response {
  return new Response(null, { status: 204, headers: { 'cache-control': 'no-store' } });
}

/** 202 with the job that does the work, and where to ask for it. */
export function respondAccepted(job: { id: string }): Response {
  return respondJson(job, { status: 202, headers: { location: `/api/v1/jobs/${job.id}` } });
}

/** Any thrown value as an `application/problem+json` answer; unknown ones are logged whole and answered plainly. */
export function respondProblem(error: unknown, context: EndpointContext): Response {
  const { requestId, log } = requestFacts(context);
  const { problem, headers } = toProblem(error, requestId);
  if (problem.status >= 500) log.error({ err: error, requestId }, 'Request failed');
  else log.debug({ code: problem.code, requestId }, problem.detail);
  return new Response(JSON.stringify(problem), {
    status: problem.status,
    headers: { 'content-type': 'application/problem+json', 'cache-control': 'no-store', ...headers },
  });
}

/** RFC 9457 problem details of any thrown value; nothing of an unknown one is told. */
export function toProblem(error: unknown, requestId?: string): { problem: Problem; headers: Record<string, string> } {
  const id = requestId === undefined ? {} : { requestId };
  if (error instanceof AppError) {
    return {
      problem: {
        ...kind(error.status),
        detail: error.message,
        code: error.code,
        ...id,
        ...(error.fields && { fields: error.fields }),
        ...(error.details && { details: error.details }),
      },
      headers: error.headers,
    };
  }
  if (error instanceof NumericalError) {
    return {
      problem: { ...kind(NUMERICAL_STATUS[error.code] ?? 422), detail: error.message, code: error.code, ...id, details: error.details },
      headers: {},
    };
  }
  if (error instanceof z.core.$ZodError) return toProblem(validationFailed(error), requestId);
  const quote = requestId === undefined ? '' : ` and quote request ${requestId}`;
  return {
    problem: {
      ...kind(500),
      detail: `Something failed on the server. Nothing was changed by this request. Try again; if it fails again, tell your administrator${quote}.`,
      code: 'INTERNAL',
      ...id,
    },
    headers: {},
  };
}

/**
 * The request's JSON body in the shape of `schema`.
 * @throws AppError MEDIA_TYPE_UNSUPPORTED, BODY_TOO_LARGE, BODY_NOT_JSON or VALIDATION_FAILED with its fields
 */
export async function parseBody<T extends z.ZodType>(request: Request, schema: T, limit = JSON_BODY_LIMIT): Promise<z.output<T>> {
  const type = request.headers.get('content-type') ?? '';
  if (!/^application\/(?:[\w.+-]+\+)?json\b/i.test(type))
    throw new AppError('MEDIA_TYPE_UNSUPPORTED', 'This address takes JSON. Send the body with the header "Content-Type: application/json".');
  const text = await readText(request, limit);
  let value: unknown;
  try {
    value = JSON.parse(text, (_key, part: unknown) => (typeof part === 'string' ? storable(part) : part));
  } catch (cause) {
    if (cause instanceof AppError) throw cause;
    const why = cause instanceof Error ? cause.message : 'it could not be read';
    throw new AppError('BODY_NOT_JSON', `The body is not valid JSON: ${why}. Correct it and send it again.`, { cause });
  }
  return parseValue(schema, value);
}

/** Text that the database can hold. @throws AppError VALIDATION_FAILED for a null character or half of one */
function storable(text: string): string {
  if (/\0|\p{Cs}/u.test(text))
    throw new AppError('VALIDATION_FAILED', 'The request is not valid. A text in it holds a null character or half of a character, which cannot be stored. Remove it.');
  return text;
}

/** The query of `url` in the shape of `schema`; a repeated name counts once, with its last value. @throws AppError VALIDATION_FAILED */
export function parseQuery<T extends z.ZodType>(url: URL, schema: T): z.output<T> {
  return parseValue(schema, Object.fromEntries(url.searchParams));
}

/** `value` in the shape of `schema`. @throws AppError VALIDATION_FAILED */
export function parseValue<T extends z.ZodType>(schema: T, value: unknown): z.output<T> {
  const parsed = schema.safeParse(value);
  if (!parsed.success) throw validationFailed(parsed.error);
  return parsed.data;
}

/** VALIDATION_FAILED with one entry for each wrong field. */
export function validationFailed(error: z.core.$ZodError): AppError {
  const fields: FieldProblem[] = error.issues.map((issue) => ({ path: issue.path.map(String).join('.'), message: issue.message }));
  const first = fields[0];
  const where = first && first.path !== '' ? `${first.path}: ` : '';
  const rest = fields.length > 1 ? ` (and ${fields.length - 1} more)` : '';
  return new AppError('VALIDATION_FAILED', `The request is not valid. ${where}${first?.message ?? ''}${rest}`, { fields, cause: error });
}

async function readText(request: Request, limit: number): Promise<string> {
  const tooLarge = () =>
    new AppError('BODY_TOO_LARGE', `The body is larger than the ${Math.round(limit / 1024)} KiB that this address takes. Send less in one request.`);
  if (Number(request.headers.get('content-length') ?? 0) > limit) throw tooLarge();
  if (request.body === null) return '';
  const chunks: Uint8Array[] = [];
  let length = 0;
  const reader = request.body.getReader();
  for (let part = await reader.read(); !part.done; part = await reader.read()) {
    length += part.value.byteLength;
    if (length > limit) {
      await reader.cancel();
      throw tooLarge();
    }
    chunks.push(part.value);
  }
  try {
    return new TextDecoder('utf-8', { fatal: true }).decode(Buffer.concat(chunks));
  } catch (cause) {
    throw new AppError('BODY_NOT_JSON', 'The body is not valid UTF-8, which JSON has to be. Save it as UTF-8 and send it again.', { cause });
  }
}

function kind(status: number): Pick<Problem, 'type' | 'title' | 'status'> {
  return { type: 'about:blank', title: TITLE_BY_STATUS[status] ?? 'Error', status };
}

function requestFacts(context: EndpointContext): { requestId: string | undefined; log: Logger } {
  const ctx = (context.locals as { ctx?: { requestId?: string; log?: Logger } }).ctx;
  return {
    requestId: ctx?.requestId ?? context.request.headers.get('x-request-id') ?? undefined,
    log: ctx?.log ?? getLog(),
  };
}
