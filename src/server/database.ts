import type { Sequelize, Transaction } from 'sequelize';

import { connect } from '#db/connect.ts';
import { initModels } from '#db/models/init-models.ts';

import { getEnv } from './env.ts';

/** Kept across the development server's reloads. */
const holder = globalThis as { selvageDatabase?: Sequelize };

/** The process's connection pool, as the runtime role, with every model bound to it. */
export const getDatabase = (): Sequelize => {
  if (!holder.selvageDatabase) {
    const env = getEnv();
    holder.selvageDatabase = connect({ url: env.databaseUrl, pool: env.databasePool });
    initModels(holder.selvageDatabase);
  }
  return holder.selvageDatabase;
};

/** Runs `work` in one transaction: all of it happens or nothing. */
export const inTransaction = <T>(work: (transaction: Transaction) => Promise<T>): Promise<T> => getDatabase().transaction(work);

/** Closes the pool; the next query opens a new one. */
export const closeDatabase = async (): Promise<void> => {
  const open = holder.selvageDatabase;
  delete holder.selvageDatabase;
  await open?.close();
};
