import { defineMiddleware } from 'astro:middleware';

import { findActor, SESSION_COOKIE } from '#server/auth/sessions.ts';
import { AppError } from '#server/errors.ts';
import { getLog } from '#server/log.ts';
import { checkRequest } from '#server/request-checks.ts';
import { respondProblem } from '#server/respond.ts';

/** Gives every request its context, and refuses unsafe ones from other origins. */
export const onRequest = defineMiddleware(async (context, next) => {
  const { request, locals, url, cookies } = context;
  const requestId = request.headers.get('x-request-id') ?? crypto.randomUUID();
  const isApi = url.pathname.startsWith('/api/');
  locals.ctx = { actor: null, requestId, log: getLog().child({ requestId }), ip: addressOf(context) };
  try {
    checkRequest(request, url);
    if (!/^\/(_astro|healthz|readyz)/.test(url.pathname)) locals.ctx.actor = await findActor(cookies.get(SESSION_COOKIE)?.value);
  } catch (error) {
    if (isApi || error instanceof AppError) return respondProblem(error, { request, locals });
    throw error;
  }
  const { actor } = locals.ctx;
  const isPage = !isApi && request.method === 'GET' && !/^\/(_astro|healthz|readyz|sign-in|404|500)/.test(url.pathname) && !/\.\w+$/.test(url.pathname);
  if (isPage && !actor) return context.redirect(`/sign-in?next=${encodeURIComponent(url.pathname + url.search)}`);
  if (isPage && actor?.mustChangePassword && url.pathname !== '/account') return context.redirect('/account?first=1');
  return next();
});

const addressOf = (context: { clientAddress: string }): string => {
  try {
    return context.clientAddress;
  } catch {
    return 'unknown';
  }
};
