import type { APIRoute } from 'astro';

import { getMe } from '#server/auth/auth.ts';
import { handle, respondJson } from '#server/respond.ts';

export const GET: APIRoute = handle(async ({ locals }) => respondJson(await getMe(locals.ctx)));
