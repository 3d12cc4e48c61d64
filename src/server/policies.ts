import type { Role } from '#schemas/people.ts';
import { ROLES } from '#schemas/people.ts';

import type { Actor, Context } from './context.ts';
import { AppError, notFound } from './errors.ts';

/** The least role that each action needs in the team that the row belongs to. */
export const LEAST_ROLE = {
  'team.read': 'viewer',
  'member.manage': 'admin',
  'study.read': 'viewer',
  'study.write': 'designer',
  'observations.read': 'viewer',
  'observations.write': 'designer',
  'design.read': 'viewer',
  'design.write': 'designer',
  'version.read': 'viewer',
  'version.write': 'designer',
  'job.read': 'viewer',
  'job.control': 'designer',
} as const satisfies Record<string, Role>;

export type Action = keyof typeof LEAST_ROLE;

/** Whether a role includes another: viewer < designer < reviewer < admin. */
export const includesRole = (role: Role, needed: Role): boolean => ROLES.indexOf(role) >= ROLES.indexOf(needed);

/** The signed-in person. @throws AppError NOT_SIGNED_IN, or PASSWORD_CHANGE_REQUIRED while a one-time password is in force */
export const requireActor = (ctx: Context, { allowOneTimePassword = false } = {}): Actor => {
  if (!ctx.actor) throw new AppError('NOT_SIGNED_IN', 'You are not signed in. Sign in and try again.');
  if (ctx.actor.mustChangePassword && !allowOneTimePassword)
    throw new AppError('PASSWORD_CHANGE_REQUIRED', 'Your password was set by an administrator. Change it before anything else.');
  return ctx.actor;
};

/**
 * The person, when their role in the team allows the action.
 * @throws AppError NOT_SIGNED_IN; NOT_FOUND for a team that they are not in (its rows do not exist for them); FORBIDDEN naming the role needed
 */
export const authorize = (ctx: Context, action: Action, teamId: string, what = 'page'): Actor => {
  const actor = requireActor(ctx);
  const role = actor.memberships.get(teamId);
  if (!role) throw notFound(what);
  const needed = LEAST_ROLE[action];
  if (!includesRole(role, needed))
    throw new AppError('FORBIDDEN', `This needs the role ${needed} in the team; yours is ${role}. Ask a team administrator.`, { details: { needed, role } });
  return actor;
};

/** Whether `authorize` would let the action pass: for buttons that would only fail. */
export const mayAct = (ctx: Context, action: Action, teamId: string): boolean => {
  const role = ctx.actor?.memberships.get(teamId);
  return role !== undefined && includesRole(role, LEAST_ROLE[action]);
};
