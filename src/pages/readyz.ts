import type { APIRoute } from 'astro';

import { checkReadiness } from '#server/health.ts';
import { respondJson } from '#server/respond.ts';

/** 200 when requests can be served, 503 while they cannot. */
export const GET: APIRoute = async () => {
  const readiness = await checkReadiness();
  return respondJson(readiness, { status: readiness.ready ? 200 : 503 });
};
