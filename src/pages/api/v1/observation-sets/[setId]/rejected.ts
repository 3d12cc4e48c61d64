import type { APIRoute } from 'astro';

import { rejectedQuerySchema } from '#schemas/observation-sets.ts';
import { listRejected, streamRejectedCsv } from '#server/observations/observations.ts';
import { handle, parseQuery, respondJson } from '#server/respond.ts';
import { sendStream } from '#server/send.ts';

export const GET: APIRoute = handle(async ({ locals, params, url }) => {
  const { format, ...query } = parseQuery(url, rejectedQuerySchema);
  if (format === 'json') return respondJson(await listRejected(locals.ctx, params.setId, query));
  const { fileName, chunks } = await streamRejectedCsv(locals.ctx, params.setId);
  return sendStream(chunks, { mediaType: 'text/csv; charset=utf-8', fileName });
});
