import type { APIRoute } from 'astro';

import { handle } from '#server/respond.ts';
import { respondNotModified, sendBytes } from '#server/send.ts';
import { openExport } from '#server/versions/versions.ts';

export const GET: APIRoute = handle(async ({ request, locals, params }) => {
  const { bytes, mediaType, fileName, sha256 } = await openExport(locals.ctx, params.versionId, params.format);
  return respondNotModified(request, sha256) ?? sendBytes(bytes, { mediaType, fileName, etag: sha256 });
});
