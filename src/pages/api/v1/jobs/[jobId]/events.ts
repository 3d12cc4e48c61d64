import type { APIRoute } from 'astro';

import { jobEvents } from '#server/jobs/job-events.ts';
import { getJob } from '#server/jobs/jobs.ts';
import { handle } from '#server/respond.ts';
import { sendStream } from '#server/send.ts';

export const GET: APIRoute = handle(async ({ request, locals, params }) => {
  const job = await getJob(locals.ctx, params.jobId);
  return sendStream(jobEvents(locals.ctx, job, request.signal), { mediaType: 'text/event-stream', cacheControl: 'no-store' });
});
