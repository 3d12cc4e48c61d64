import type { APIRoute } from 'astro';

import { getLastCheck, startCheck } from '#server/designs/designs.ts';
import { handle, respondAccepted, respondJson } from '#server/respond.ts';

/** The newest successful check, or null. */
export const GET: APIRoute = handle(async ({ locals, params }) => respondJson(await getLastCheck(locals.ctx, params.designId)));

export const POST: APIRoute = handle(async ({ locals, params }) => respondAccepted(await startCheck(locals.ctx, params.designId)));
