import type { APIRoute } from 'astro';

import { cancelJob } from '#server/jobs/jobs.ts';
import { handle, respondJson } from '#server/respond.ts';

export const POST: APIRoute = handle(async ({ locals, params }) => respondJson(await cancelJob(locals.ctx, params.jobId)));
