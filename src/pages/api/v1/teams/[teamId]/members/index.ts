import type { APIRoute } from 'astro';

import { addMemberSchema } from '#schemas/people.ts';
import { handle, parseBody, respondJson } from '#server/respond.ts';
import { addMember, listMembers } from '#server/teams/teams.ts';

export const GET: APIRoute = handle(async ({ locals, params }) => respondJson(await listMembers(locals.ctx, params.teamId)));

export const POST: APIRoute = handle(async ({ request, locals, params }) =>
  respondJson(await addMember(locals.ctx, params.teamId, await parseBody(request, addMemberSchema)), { status: 201 }),
);
