import type { APIRoute } from 'astro';

import { listQuerySchema } from '#schemas/list.ts';
import { createStudySchema } from '#schemas/studies.ts';
import { handle, parseBody, parseQuery, respondJson } from '#server/respond.ts';
import { createStudy, listStudies } from '#server/studies/studies.ts';

export const GET: APIRoute = handle(async ({ locals, params, url }) =>
  respondJson(await listStudies(locals.ctx, params.teamId, parseQuery(url, listQuerySchema))),
);

export const POST: APIRoute = handle(async ({ request, locals, params }) =>
  respondJson(await createStudy(locals.ctx, params.teamId, await parseBody(request, createStudySchema)), { status: 201 }),
);
