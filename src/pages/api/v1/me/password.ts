import type { APIRoute } from 'astro';

import { changePasswordSchema } from '#schemas/people.ts';
import { changePassword } from '#server/auth/auth.ts';
import { sessionCookie } from '#server/auth/sessions.ts';
import { handle, parseBody, respondEmpty } from '#server/respond.ts';

export const PUT: APIRoute = handle(async ({ request, locals, url }) => {
  const sealed = await changePassword(locals.ctx, await parseBody(request, changePasswordSchema));
  const response = respondEmpty();
  response.headers.append('set-cookie', sessionCookie(sealed, url.protocol === 'https:'));
  return response;
});
