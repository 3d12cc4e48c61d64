import type { APIRoute } from 'astro';

import { openOriginal } from '#server/observations/observations.ts';
import { handle } from '#server/respond.ts';
import { sendStream } from '#server/send.ts';

export const GET: APIRoute = handle(async ({ locals, params }) => {
  const { fileName, byteLength, sha256, chunks } = await openOriginal(locals.ctx, params.setId);
  return sendStream(chunks, { mediaType: 'application/octet-stream', fileName, length: byteLength, etag: sha256 });
});
