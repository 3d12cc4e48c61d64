import type { APIRoute } from 'astro';

import { saveVersionSchema } from '#schemas/versions.ts';
import { startSaveVersion } from '#server/designs/designs.ts';
import { handle, parseBody, respondAccepted } from '#server/respond.ts';

export const POST: APIRoute = handle(async ({ request, locals, params }) =>
  respondAccepted(await startSaveVersion(locals.ctx, params.designId, await parseBody(request, saveVersionSchema))),
);
