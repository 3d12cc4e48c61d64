import type { APIRoute } from 'astro';

import { handle, respondJson } from '#server/respond.ts';
import { listFindings } from '#server/versions/versions.ts';

export const GET: APIRoute = handle(async ({ locals, params }) => respondJson(await listFindings(locals.ctx, params.versionId)));
