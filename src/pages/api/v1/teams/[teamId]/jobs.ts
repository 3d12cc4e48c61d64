import type { APIRoute } from 'astro';

import { listQuerySchema } from '#schemas/list.ts';
import { listJobs } from '#server/jobs/jobs.ts';
import { handle, parseQuery, respondJson } from '#server/respond.ts';

export const GET: APIRoute = handle(async ({ locals, params, url }) =>
  respondJson(await listJobs(locals.ctx, params.teamId, parseQuery(url, listQuerySchema))),
);
