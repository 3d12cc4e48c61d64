import type { APIRoute } from 'astro';

import { createDesignSchema } from '#schemas/designs.ts';
import { listQuerySchema } from '#schemas/list.ts';
import { createDesign, listDesigns } from '#server/designs/designs.ts';
import { handle, parseBody, parseQuery, respondJson } from '#server/respond.ts';

export const GET: APIRoute = handle(async ({ locals, params, url }) =>
  respondJson(await listDesigns(locals.ctx, params.studyId, parseQuery(url, listQuerySchema))),
);

export const POST: APIRoute = handle(async ({ request, locals, params }) =>
  respondJson(await createDesign(locals.ctx, params.studyId, await parseBody(request, createDesignSchema)), { status: 201 }),
);
