import type { APIRoute } from 'astro';

import { handle, respondAccepted } from '#server/respond.ts';
import { startRebuild } from '#server/versions/versions.ts';

export const POST: APIRoute = handle(async ({ locals, params }) => respondAccepted(await startRebuild(locals.ctx, params.versionId)));
