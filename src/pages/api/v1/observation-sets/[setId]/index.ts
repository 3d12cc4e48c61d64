import type { APIRoute } from 'astro';

import { deleteObservationSet, getObservationSet } from '#server/observations/observations.ts';
import { handle, respondEmpty, respondJson } from '#server/respond.ts';

export const GET: APIRoute = handle(async ({ locals, params }) => respondJson(await getObservationSet(locals.ctx, params.setId)));

export const DELETE: APIRoute = handle(async ({ locals, params }) => {
  await deleteObservationSet(locals.ctx, params.setId);
  return respondEmpty();
});
