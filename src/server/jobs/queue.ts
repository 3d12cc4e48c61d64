import PgBoss from 'pg-boss';
import type { Transaction } from 'sequelize';

import { QUEUE, QUEUE_SCHEMA } from '#db/migrate.ts';

import { getEnv } from '../env.ts';
import { getLog } from '../log.ts';

/** Seconds without a sign of life after which a running job is given to another worker. */
export const EXPIRE_SECONDS = 60;

export interface JobMessage {
  jobId: string;
}

const holder = globalThis as { selvageQueue?: Promise<PgBoss> };

/** The process's connection to the queue, for sending only; workers start one of their own. */
export const getQueue = (): Promise<PgBoss> => {
  holder.selvageQueue ??= startQueue(false);
  return holder.selvageQueue;
};

/** Opens a connection to the queue; with `supervise` it also retries what dead workers left. */
export const startQueue = async (supervise: boolean): Promise<PgBoss> => {
  const boss = new PgBoss({
    connectionString: getEnv().databaseUrl,
    schema: QUEUE_SCHEMA,
    migrate: false,
    supervise,
    schedule: false,
    max: supervise ? 4 : 2,
    maintenanceIntervalSeconds: 2,
    monitorStateIntervalSeconds: 2,
  });
  boss.on('error', (error) => getLog().error({ err: error }, 'Job queue failed'));
  await boss.start();
  return boss;
};

/** Ends the sending connection, if there is one. */
export const closeQueue = async (): Promise<void> => {
  const open = holder.selvageQueue;
  delete holder.selvageQueue;
  if (open) await (await open).stop({ graceful: false, wait: true });
};

/** Puts a message into the queue inside the caller's transaction: it is there when the transaction commits, and only then. */
export const sendMessage = async (message: JobMessage, transaction: Transaction): Promise<void> => {
  const connection = (transaction as unknown as { connection: { query(text: string, values: unknown[]): Promise<{ rows: unknown[] }> } }).connection;
  const db = { executeSql: (text: string, values: unknown[]) => connection.query(text, values) };
  const boss = await getQueue();
  const id = await boss.send(QUEUE, message, { db: db as never, retryLimit: 3, retryDelay: 1, expireInSeconds: EXPIRE_SECONDS });
  if (id === null) throw new Error('The job queue did not take the message: the queue is missing. Migrate the database.');
};
