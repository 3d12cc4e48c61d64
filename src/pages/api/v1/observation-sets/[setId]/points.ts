import type { APIRoute } from 'astro';

import { pointsQuerySchema } from '#schemas/observation-sets.ts';
import { listPoints } from '#server/observations/points.ts';
import { handle, parseQuery, respondJson } from '#server/respond.ts';

export const GET: APIRoute = handle(async ({ locals, params, url }) =>
  respondJson(await listPoints(locals.ctx, params.setId, parseQuery(url, pointsQuerySchema))),
);
