import type { APIRoute } from 'astro';

import { getColumnsBundle } from '#server/observations/observations.ts';
import { handle } from '#server/respond.ts';
import { sendBytes } from '#server/send.ts';

export const GET: APIRoute = handle(async ({ locals, params }) =>
  sendBytes(await getColumnsBundle(locals.ctx, params.setId), { mediaType: 'application/octet-stream' }),
);
