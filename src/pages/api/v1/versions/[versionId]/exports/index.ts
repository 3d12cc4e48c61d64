import type { APIRoute } from 'astro';

import { handle, respondJson } from '#server/respond.ts';
import { listExports } from '#server/versions/versions.ts';

export const GET: APIRoute = handle(async ({ locals, params }) => respondJson(await listExports(locals.ctx, params.versionId)));
