import type { Sequelize } from 'sequelize';

import { connect } from '#db/connect.ts';
import { pendingMigrations } from '#db/migrate.ts';

import { getEnv } from './env.ts';

export interface Readiness {
  ready: boolean;
  /** One word per part: 'ok', or what is wrong. */
  database: 'ok' | 'unreachable';
  migrations: 'ok' | 'pending' | 'unknown';
}

/** One connection of its own, so that a busy pool does not make a healthy server look unready. */
const holder = globalThis as { selvageHealthConnection?: Sequelize };

/** Whether this process can serve: the database answers, and its schema is the one this build expects. Never throws. */
export async function checkReadiness(): Promise<Readiness> {
  try {
    holder.selvageHealthConnection ??= connect({ url: getEnv().databaseUrl, pool: 1 });
    await holder.selvageHealthConnection.query('SELECT 1');
  } catch {
    return { ready: false, database: 'unreachable', migrations: 'unknown' };
  }
  try {
    const pending = await pendingMigrations(holder.selvageHealthConnection);
    return { ready: pending.length === 0, database: 'ok', migrations: pending.length === 0 ? 'ok' : 'pending' };
  } catch {
    return { ready: false, database: 'ok', migrations: 'unknown' };
  }
}
