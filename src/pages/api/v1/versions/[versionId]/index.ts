import type { APIRoute } from 'astro';

import { handle, respondJson } from '#server/respond.ts';
import { getVersion } from '#server/versions/versions.ts';

export const GET: APIRoute = handle(async ({ locals, params }) => respondJson(await getVersion(locals.ctx, params.versionId)));
