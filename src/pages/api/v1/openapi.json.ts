import type { APIRoute } from 'astro';

import { openApiDocument } from '#server/openapi/document.ts';
import { handle, respondJson } from '#server/respond.ts';

export const GET: APIRoute = handle(() => respondJson(openApiDocument()));
