import type { APIRoute } from 'astro';

import { changeRoleSchema } from '#schemas/people.ts';
import { handle, parseBody, respondEmpty, respondJson } from '#server/respond.ts';
import { changeMemberRole, removeMember } from '#server/teams/teams.ts';

export const PATCH: APIRoute = handle(async ({ request, locals, params }) => {
  const { role } = await parseBody(request, changeRoleSchema);
  return respondJson(await changeMemberRole(locals.ctx, params.teamId, params.userId, role));
});

export const DELETE: APIRoute = handle(async ({ locals, params }) => {
  await removeMember(locals.ctx, params.teamId, params.userId);
  return respondEmpty();
});
