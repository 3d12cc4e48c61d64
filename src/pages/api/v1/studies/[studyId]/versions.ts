import type { APIRoute } from 'astro';

import { listQuerySchema } from '#schemas/list.ts';
import { handle, parseQuery, respondJson } from '#server/respond.ts';
import { listVersions } from '#server/versions/versions.ts';

export const GET: APIRoute = handle(async ({ locals, params, url }) =>
  respondJson(await listVersions(locals.ctx, params.studyId, parseQuery(url, listQuerySchema))),
);
