import type { APIRoute } from 'astro';

import { listQuerySchema } from '#schemas/list.ts';
import { createObservationSet, listObservationSets } from '#server/observations/observations.ts';
import { handle, parseQuery, respondAccepted, respondJson } from '#server/respond.ts';

export const GET: APIRoute = handle(async ({ locals, params, url }) =>
  respondJson(await listObservationSets(locals.ctx, params.studyId, parseQuery(url, listQuerySchema))),
);

export const POST: APIRoute = handle(async ({ request, locals, params }) => respondAccepted(await createObservationSet(locals.ctx, params.studyId, request)));
