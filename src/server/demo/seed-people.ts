import { QueryTypes } from 'sequelize';

import { Membership } from '#db/models/Membership.ts';
import { Team } from '#db/models/Team.ts';
import { User } from '#db/models/User.ts';
import type { Role } from '#schemas/people.ts';

import { hashPassword } from '../auth/passwords.ts';
import type { Context } from '../context.ts';
import { getDatabase, inTransaction } from '../database.ts';
import { getLog } from '../log.ts';

/** The invented team of the demonstration; all its data is synthetic. */
export const DEMO_TEAM = 'Skerry Coast Forecasting (synthetic demo)';

const PEOPLE: { role: Role; name: string }[] = [
  { role: 'viewer', name: 'Vera Viewer' },
  { role: 'designer', name: 'Dario Designer' },
  { role: 'reviewer', name: 'Rhea Reviewer' },
  { role: 'admin', name: 'Ada Admin' },
];

/** Whether any account exists: a database that is in use is never seeded. */
export const hasAccounts = async (): Promise<boolean> => {
  const [row] = await getDatabase().query<{ any: boolean }>('SELECT EXISTS (SELECT 1 FROM users) AS any', { type: QueryTypes.SELECT });
  return row.any;
};

/** The demo team with one person in each role, all with the given password; returns a context that acts as the designer. */
export const seedPeople = async (password: string): Promise<{ teamId: string; designer: Context }> => {
  const passwordHash = await hashPassword(password);
  return inTransaction(async (transaction) => {
    const team = await Team.create({ name: DEMO_TEAM }, { transaction });
    const users = new Map<Role, User>();
    for (const { role, name } of PEOPLE) {
      const user = await User.create({ email: `${role}@selvage.example`, name, passwordHash }, { transaction });
      await Membership.create({ teamId: team.id, userId: user.id, role }, { transaction });
      users.set(role, user);
    }
    const { id: userId, name, email } = users.get('designer')!;
    const actor = { userId, name, email, sessionId: '', mustChangePassword: false, memberships: new Map([[team.id, 'designer' as Role]]) };
    return { teamId: team.id, designer: { actor, requestId: 'demo', log: getLog(), ip: '' } };
  });
};
