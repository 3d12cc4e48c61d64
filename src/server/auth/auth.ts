import { Op } from 'sequelize';
import type { z } from 'zod/v4';

import { Team } from '#db/models/Team.ts';
import { User } from '#db/models/User.ts';
import type { changePasswordSchema, Me, SignIn } from '#schemas/people.ts';

import type { Context } from '../context.ts';
import { getDatabase, inTransaction } from '../database.ts';
import { AppError } from '../errors.ts';
import { requireActor } from '../policies.ts';
import { hashPassword, verifyPassword } from './passwords.ts';
import { countRequest, forgetRequests, SIGN_IN_LIMITS } from './rate-limit.ts';
import { endSession, endSessionsOf, openSession, sealSession } from './sessions.ts';

/**
 * Opens a session and returns the sealed value of its cookie. A session that the browser already has ends.
 * Wrong password and unknown person get the same answer after the same work.
 * @throws AppError SIGN_IN_FAILED, RATE_LIMITED
 */
export const signIn = async (ctx: Context, { email, password }: SignIn): Promise<string> => {
  const accountKey = `sign-in:account:${email}`;
  await countRequest(`sign-in:address:${ctx.ip}`, SIGN_IN_LIMITS.address);
  await countRequest(accountKey, SIGN_IN_LIMITS.account);
  const user = await User.findOne({ where: { email } });
  if (!(await verifyPassword(user?.passwordHash ?? null, password)) || !user)
    throw new AppError('SIGN_IN_FAILED', 'E-mail address and password do not belong together. Check both and try again.');
  await forgetRequests(accountKey);
  if (ctx.actor) await endSession(ctx.actor.sessionId);
  return sealSession(await openSession(user.id));
};

/** Ends the session of the request, if it has one. */
export const signOut = async (ctx: Context): Promise<void> => {
  if (ctx.actor) await endSession(ctx.actor.sessionId);
};

/** The signed-in person and their teams. @throws AppError NOT_SIGNED_IN */
export const getMe = async (ctx: Context): Promise<Me> => {
  const actor = requireActor(ctx, { allowOneTimePassword: true });
  getDatabase();
  const teams = await Team.findAll({ where: { id: { [Op.in]: [...actor.memberships.keys()] } }, order: [['name', 'ASC'], ['id', 'ASC']] });
  return {
    id: actor.userId,
    email: actor.email,
    name: actor.name,
    mustChangePassword: actor.mustChangePassword,
    memberships: teams.map((team) => ({ teamId: team.id, teamName: team.name, role: actor.memberships.get(team.id)! })),
  };
};

/**
 * Sets a new password, ends every session of the person and returns the cookie value of a new one.
 * @throws AppError NOT_SIGNED_IN, PASSWORD_WRONG, RATE_LIMITED, VALIDATION_FAILED when old and new are the same
 */
export const changePassword = async (ctx: Context, input: z.output<typeof changePasswordSchema>): Promise<string> => {
  const actor = requireActor(ctx, { allowOneTimePassword: true });
  const key = `password:${actor.userId}`;
  await countRequest(key, SIGN_IN_LIMITS.account);
  const user = await User.findByPk(actor.userId);
  if (!user || !(await verifyPassword(user.passwordHash, input.currentPassword)))
    throw new AppError('PASSWORD_WRONG', 'The current password is not right. Type it again.', {
      fields: [{ path: 'currentPassword', message: 'This is not your current password.' }],
    });
  if (input.currentPassword === input.newPassword)
    throw new AppError('VALIDATION_FAILED', 'The new password is the same as the current one. Choose another.', {
      fields: [{ path: 'newPassword', message: 'Choose a password that differs from the current one.' }],
    });
  await forgetRequests(key);
  const passwordHash = await hashPassword(input.newPassword);
  const sessionId = await inTransaction(async (transaction) => {
    await user.update({ passwordHash, mustChangePassword: false }, { transaction });
    await endSessionsOf(user.id, transaction);
    return openSession(user.id, transaction);
  });
  return sealSession(sessionId);
};
