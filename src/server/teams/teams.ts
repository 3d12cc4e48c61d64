import { Op, type Transaction } from 'sequelize';
import type { z } from 'zod/v4';

import { Membership } from '#db/models/Membership.ts';
import { Team as TeamRow } from '#db/models/Team.ts';
import { User } from '#db/models/User.ts';
import type { List } from '#schemas/list.ts';
import type { AddedMember, addMemberSchema, createTeamSchema, Member, Role, Team } from '#schemas/people.ts';

import { hashPassword, makeOneTimePassword } from '../auth/passwords.ts';
import { endSessionsOf } from '../auth/sessions.ts';
import type { Context } from '../context.ts';
import { inTransaction } from '../database.ts';
import { AppError, notFound } from '../errors.ts';
import { requireId } from '../pages-of-lists.ts';
import { authorize, requireActor } from '../policies.ts';

const presentTeam = (team: TeamRow, role: Role): Team => ({ id: team.id, name: team.name, createdAt: team.createdAt.toISOString(), role });

const presentMember = (membership: Membership, user: User): Member => ({
  userId: user.id,
  name: user.name,
  email: user.email,
  role: membership.role,
  joinedAt: membership.createdAt.toISOString(),
});

/** The teams of the signed-in person, by name. */
export const listTeams = async (ctx: Context): Promise<List<Team>> => {
  const { memberships } = requireActor(ctx);
  const teams = await TeamRow.findAll({ where: { id: { [Op.in]: [...memberships.keys()] } }, order: [['name', 'ASC'], ['id', 'ASC']] });
  return { items: teams.map((team) => presentTeam(team, memberships.get(team.id)!)), nextCursor: null };
};

/** A new team whose administrator is the signed-in person. */
export const createTeam = async (ctx: Context, { name }: z.output<typeof createTeamSchema>): Promise<Team> => {
  const actor = requireActor(ctx);
  return inTransaction(async (transaction) => {
    const team = await TeamRow.create({ name }, { transaction });
    await Membership.create({ teamId: team.id, userId: actor.userId, role: 'admin' }, { transaction });
    return presentTeam(team, 'admin');
  });
};

/** One team. @throws AppError NOT_FOUND */
export const getTeam = async (ctx: Context, teamId: string | undefined): Promise<Team> => {
  const id = requireId(teamId, 'team');
  const actor = authorize(ctx, 'team.read', id, 'team');
  const team = await TeamRow.findByPk(id);
  if (!team) throw notFound('team');
  return presentTeam(team, actor.memberships.get(id)!);
};

/** Everybody in a team, by name. */
export const listMembers = async (ctx: Context, teamId: string | undefined): Promise<List<Member>> => {
  const id = requireId(teamId, 'team');
  authorize(ctx, 'team.read', id, 'team');
  const memberships = await Membership.findAll({ where: { teamId: id } });
  const users = await User.findAll({ where: { id: { [Op.in]: memberships.map((m) => m.userId) } }, order: [['name', 'ASC'], ['id', 'ASC']] });
  const byUser = new Map(memberships.map((m) => [m.userId, m]));
  return { items: users.map((user) => presentMember(byUser.get(user.id)!, user)), nextCursor: null };
};

/**
 * Adds a person to a team. Without an account they get one, with a one-time password that only this answer tells.
 * @throws AppError FORBIDDEN, ALREADY_EXISTS
 */
export const addMember = async (ctx: Context, teamId: string | undefined, input: z.output<typeof addMemberSchema>): Promise<AddedMember> => {
  const id = requireId(teamId, 'team');
  authorize(ctx, 'member.manage', id, 'team');
  const oneTimePassword = makeOneTimePassword();
  const passwordHash = await hashPassword(oneTimePassword);
  return inTransaction(async (transaction) => {
    const [user, isNew] = await User.findOrCreate({
      where: { email: input.email },
      defaults: { email: input.email, name: input.name, passwordHash, mustChangePassword: true },
      transaction,
    });
    if (await Membership.findOne({ where: { teamId: id, userId: user.id }, transaction }))
      throw new AppError('ALREADY_EXISTS', `${input.email} is already in this team. Change the role in the list instead.`, {
        fields: [{ path: 'email', message: 'This person is already in the team.' }],
      });
    const membership = await Membership.create({ teamId: id, userId: user.id, role: input.role }, { transaction });
    return { ...presentMember(membership, user), oneTimePassword: isNew ? oneTimePassword : null };
  });
};

/** Gives a member another role. @throws AppError FORBIDDEN, NOT_FOUND, LAST_ADMIN */
export const changeMemberRole = async (ctx: Context, teamId: string | undefined, userId: string | undefined, role: Role): Promise<Member> =>
  changeMembership(ctx, teamId, userId, async (membership, user, transaction) => {
    if (membership.role === 'admin' && role !== 'admin') await refuseLastAdmin(membership, transaction);
    await membership.update({ role }, { transaction });
    return presentMember(membership, user);
  });

/** Takes a person out of a team and ends their sessions. @throws AppError FORBIDDEN, NOT_FOUND, LAST_ADMIN */
export const removeMember = async (ctx: Context, teamId: string | undefined, userId: string | undefined): Promise<void> =>
  changeMembership(ctx, teamId, userId, async (membership, user, transaction) => {
    if (membership.role === 'admin') await refuseLastAdmin(membership, transaction);
    await membership.destroy({ transaction });
    await endSessionsOf(user.id, transaction);
  });

const changeMembership = async <T>(
  ctx: Context,
  teamId: string | undefined,
  userId: string | undefined,
  change: (membership: Membership, user: User, transaction: Transaction) => Promise<T>,
): Promise<T> => {
  const id = requireId(teamId, 'team');
  authorize(ctx, 'member.manage', id, 'team');
  const memberId = requireId(userId, 'member');
  return inTransaction(async (transaction) => {
    // locking the team's row makes two changes at once wait for each other, so that one admin always remains
    await TeamRow.findByPk(id, { transaction, lock: transaction.LOCK.UPDATE });
    const membership = await Membership.findOne({ where: { teamId: id, userId: memberId }, transaction });
    const user = membership && (await User.findByPk(memberId, { transaction }));
    if (!membership || !user) throw notFound('member');
    return change(membership, user, transaction);
  });
};

const refuseLastAdmin = async (membership: Membership, transaction: Transaction): Promise<void> => {
  const admins = await Membership.count({ where: { teamId: membership.teamId, role: 'admin' }, transaction });
  if (admins <= 1)
    throw new AppError('LAST_ADMIN', 'A team needs an administrator, and this is the last one. Make somebody else administrator first.');
};
