import { sealData, unsealData } from 'iron-session';
import { Op, type Transaction } from 'sequelize';

import { Membership } from '#db/models/Membership.ts';
import { Session } from '#db/models/Session.ts';
import { User } from '#db/models/User.ts';

import type { Actor } from '../context.ts';
import { getDatabase } from '../database.ts';
import { getEnv } from '../env.ts';

export const SESSION_COOKIE = 'selvage_session';
const LIFETIME_MS = 14 * 24 * 3600 * 1000;
/** How stale `last_seen_at` may become before a request writes it again. */
const SEEN_EVERY_MS = 5 * 60 * 1000;

interface Sealed {
  sessionId?: string;
}

/** Opens a session and returns its id. Expired sessions of the person go at the same time. */
export const openSession = async (userId: string, transaction?: Transaction): Promise<string> => {
  getDatabase();
  await Session.destroy({ where: { userId, expiresAt: { [Op.lt]: new Date() } }, transaction });
  const session = await Session.create({ userId, expiresAt: new Date(Date.now() + LIFETIME_MS) }, { transaction });
  return session.id;
};

/** Ends one session. */
export const endSession = async (sessionId: string): Promise<void> => {
  await Session.destroy({ where: { id: sessionId } });
};

/** Ends every session of a person. */
export const endSessionsOf = async (userId: string, transaction?: Transaction): Promise<void> => {
  await Session.destroy({ where: { userId }, transaction });
};

/** The cookie's value for a session: sealed (encrypted and authenticated), so that it cannot be made up. */
export const sealSession = (sessionId: string): Promise<string> =>
  sealData({ sessionId } satisfies Sealed, { password: getEnv().sessionSecret, ttl: LIFETIME_MS / 1000 });

/** Set-Cookie header for a sealed session, or with null for its removal. */
export const sessionCookie = (sealed: string | null, isSecure: boolean): string =>
  [
    `${SESSION_COOKIE}=${sealed ?? ''}`,
    'Path=/',
    'HttpOnly',
    'SameSite=Lax',
    `Max-Age=${sealed === null ? 0 : LIFETIME_MS / 1000}`,
    ...(isSecure ? ['Secure'] : []),
  ].join('; ');

/** The person whose live session a cookie names, with their roles; null when there is none. */
export const findActor = async (cookie: string | undefined): Promise<Actor | null> => {
  if (!cookie) return null;
  const { sessionId } = await unsealData<Sealed>(cookie, { password: getEnv().sessionSecret, ttl: LIFETIME_MS / 1000 }).catch((): Sealed => ({}));
  if (!sessionId) return null;
  getDatabase();
  const session = await Session.findOne({ where: { id: sessionId, expiresAt: { [Op.gt]: new Date() } } });
  const user = session && (await User.findByPk(session.userId));
  if (!session || !user) return null;
  if (Date.now() - session.lastSeenAt.getTime() > SEEN_EVERY_MS)
    await Session.update({ lastSeenAt: new Date() }, { where: { id: session.id } });
  const memberships = await Membership.findAll({ where: { userId: user.id } });
  return {
    userId: user.id,
    name: user.name,
    email: user.email,
    sessionId: session.id,
    mustChangePassword: user.mustChangePassword,
    memberships: new Map(memberships.map(({ teamId, role }) => [teamId, role])),
  };
};
