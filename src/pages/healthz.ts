import type { APIRoute } from 'astro';

import { respondJson } from '#server/respond.ts';

/** The process lives; says nothing about the database. */
export const GET: APIRoute = () => respondJson({ status: 'ok' });
