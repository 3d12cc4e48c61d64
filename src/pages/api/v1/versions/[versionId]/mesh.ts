import type { APIRoute } from 'astro';

import { handle } from '#server/respond.ts';
import { respondNotModified, sendBytes } from '#server/send.ts';
import { getMeshBundle } from '#server/versions/versions.ts';

export const GET: APIRoute = handle(async ({ request, locals, params }) => {
  const { bytes, meshHash } = await getMeshBundle(locals.ctx, params.versionId);
  return respondNotModified(request, meshHash) ?? sendBytes(bytes, { mediaType: 'application/octet-stream', etag: meshHash });
});
