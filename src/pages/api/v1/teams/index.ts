import type { APIRoute } from 'astro';

import { createTeamSchema } from '#schemas/people.ts';
import { handle, parseBody, respondJson } from '#server/respond.ts';
import { createTeam, listTeams } from '#server/teams/teams.ts';

export const GET: APIRoute = handle(async ({ locals }) => respondJson(await listTeams(locals.ctx)));

export const POST: APIRoute = handle(async ({ request, locals }) =>
  respondJson(await createTeam(locals.ctx, await parseBody(request, createTeamSchema)), { status: 201 }),
);
