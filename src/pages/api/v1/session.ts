import type { APIRoute } from 'astro';

import { signInSchema } from '#schemas/people.ts';
import { signIn, signOut } from '#server/auth/auth.ts';
import { sessionCookie } from '#server/auth/sessions.ts';
import { handle, parseBody, respondEmpty } from '#server/respond.ts';

export const POST: APIRoute = handle(async ({ request, locals, url }) => {
  const sealed = await signIn(locals.ctx, await parseBody(request, signInSchema));
  const response = respondEmpty();
  response.headers.append('set-cookie', sessionCookie(sealed, url.protocol === 'https:'));
  return response;
});

export const DELETE: APIRoute = handle(async ({ locals, url }) => {
  await signOut(locals.ctx);
  const response = respondEmpty();
  response.headers.append('set-cookie', sessionCookie(null, url.protocol === 'https:'));
  return response;
});
