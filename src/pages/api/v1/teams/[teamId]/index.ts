import type { APIRoute } from 'astro';

import { handle, respondJson } from '#server/respond.ts';
import { getTeam } from '#server/teams/teams.ts';

export const GET: APIRoute = handle(async ({ locals, params }) => respondJson(await getTeam(locals.ctx, params.teamId)));
