import type { APIRoute } from 'astro';

import { updateStudySchema } from '#schemas/studies.ts';
import { handle, parseBody, respondEmpty, respondJson } from '#server/respond.ts';
import { deleteStudy, getStudy, updateStudy } from '#server/studies/studies.ts';

export const GET: APIRoute = handle(async ({ locals, params }) => respondJson(await getStudy(locals.ctx, params.studyId)));

export const PATCH: APIRoute = handle(async ({ request, locals, params }) =>
  respondJson(await updateStudy(locals.ctx, params.studyId, await parseBody(request, updateStudySchema))),
);

export const DELETE: APIRoute = handle(async ({ locals, params }) => {
  await deleteStudy(locals.ctx, params.studyId);
  return respondEmpty();
});
