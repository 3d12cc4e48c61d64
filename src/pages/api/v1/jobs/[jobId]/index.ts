import type { APIRoute } from 'astro';

import { getJob } from '#server/jobs/jobs.ts';
import { handle, respondJson } from '#server/respond.ts';

export const GET: APIRoute = handle(async ({ locals, params }) => respondJson(await getJob(locals.ctx, params.jobId)));
