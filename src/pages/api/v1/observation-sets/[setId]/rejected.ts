import type { APIRoute } from 'astro';

import { z } from 'zod/v4';

import { listQuerySchema } from '#schemas/list.ts';
import { listRejected, streamRejectedCsv } from '#server/observations/observations.ts';
import { handle, parseQuery, respondJson } from '#server/respond.ts';
import { sendStream } from '#server/send.ts';

const querySchema = listQuerySchema.extend({ format: z.enum(['json', 'csv']).default('json') });

export const GET: APIRoute = handle(async ({ locals, params, url }) => {
  const { format, ...query } = parseQuery(url, querySchema);
  if (format === 'json') return respondJson(await listRejected(locals.ctx, params.setId, query));
  const { fileName, chunks } = await streamRejectedCsv(locals.ctx, params.setId);
  return sendStream(chunks, { mediaType: 'text/csv; charset=utf-8', fileName });
});
