import type { APIRoute } from 'astro';

import { updateDesignSchema } from '#schemas/designs.ts';
import { deleteDesign, getDesign, updateDesign } from '#server/designs/designs.ts';
import { handle, parseBody, respondEmpty, respondJson } from '#server/respond.ts';

export const GET: APIRoute = handle(async ({ locals, params }) => respondJson(await getDesign(locals.ctx, params.designId)));

export const PATCH: APIRoute = handle(async ({ request, locals, params }) =>
  respondJson(await updateDesign(locals.ctx, params.designId, await parseBody(request, updateDesignSchema))),
);

export const DELETE: APIRoute = handle(async ({ locals, params }) => {
  await deleteDesign(locals.ctx, params.designId);
  return respondEmpty();
});
