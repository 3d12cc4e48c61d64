import PgBoss from 'pg-boss';
import { type QueryInterface, QueryTypes, type Sequelize, type Transaction } from 'sequelize';
import { Umzug, type UmzugStorage } from 'umzug';

import { connect, RUNTIME_ROLE } from './connect.ts';
import { migrations } from './migrations/index.ts';

/** What a migration works with. Every statement runs in `transaction`, so a failing migration leaves nothing behind. */
export interface MigrationContext {
  queryInterface: QueryInterface;
  sequelize: Sequelize;
  transaction: Transaction;
  /** Runs SQL inside the transaction. */
  sql(statement: string): Promise<void>;
}

/** One step of the schema, forward and back. Names sort by time: `20261201T0600-accounts`. */
export interface Migration {
  name: string;
  up(context: MigrationContext): Promise<void>;
  down(context: MigrationContext): Promise<void>;
}

/** Schema of the job queue, beside our own tables. */
export const QUEUE_SCHEMA = 'pgboss';
/** The one queue; what a message means is told by its job's row. */
export const QUEUE = 'jobs';

/** One number for all processes that migrate the same database. */
const MIGRATION_LOCK = 7_305_172_849;

export interface MigrateOptions {
  url: string;
  /** Told each step's name. */
  onStep?: (message: string) => void;
}

/**
 * Brings the database to the newest schema: runtime role, tables, job queue and grants.
 * An advisory lock lets several servers start at once. Returns the names of the migrations applied.
 * @throws Error that says which SQL an administrator has to run, when the account may not create the runtime role
 */
export async function migrateDatabase(options: MigrateOptions): Promise<string[]> {
  return withLock(options, async (sequelize, umzug) => {
    await ensureRuntimeRole(sequelize);
    const applied = await umzug.up();
    await installQueue(options.url, sequelize);
    return applied.map((migration) => migration.name);
  });
}

/** Takes the newest `steps` migrations back (all when absent). Returns their names. */
export async function revertDatabase(options: MigrateOptions & { steps?: number }): Promise<string[]> {
  return withLock(options, async (_sequelize, umzug) => {
    const reverted = options.steps === undefined ? await umzug.down({ to: 0 }) : await umzug.down({ step: options.steps });
    return reverted.map((migration) => migration.name);
  });
}

/** Names of the migrations that the database still lacks; with any role that may read. */
export async function pendingMigrations(sequelize: Sequelize): Promise<string[]> {
  const done = new Set(await executedNames(sequelize));
  return migrations.map((migration) => migration.name).filter((name) => !done.has(name));
}

async function withLock<T>(options: MigrateOptions, work: (sequelize: Sequelize, umzug: Umzug<Sequelize>) => Promise<T>): Promise<T> {
  const sequelize = connect({ url: options.url, pool: 4, role: null });
  try {
    return await sequelize.transaction(async (lock) => {
      await sequelize.query(`SET LOCAL idle_in_transaction_session_timeout = 0`, { transaction: lock });
      await sequelize.query(`SELECT pg_advisory_xact_lock(${MIGRATION_LOCK})`, { transaction: lock });
      return work(sequelize, createUmzug(sequelize, options.onStep));
    });
  } finally {
    await sequelize.close();
  }
}

function createUmzug(sequelize: Sequelize, onStep: ((message: string) => void) | undefined): Umzug<Sequelize> {
  const inTransaction = (step: (context: MigrationContext) => Promise<void>, record: (transaction: Transaction) => Promise<void>) =>
    sequelize.transaction(async (transaction) => {
      await step({
        queryInterface: sequelize.getQueryInterface(),
        sequelize,
        transaction,
        sql: async (statement) => void (await sequelize.query(statement, { transaction })),
      });
      await record(transaction);
    });
  return new Umzug<Sequelize>({
    context: sequelize,
    logger: undefined,
    storage: new MigrationTable(sequelize),
    migrations: migrations.map((migration) => ({
      name: migration.name,
      up: async () => {
        onStep?.(`Migrating: ${migration.name}`);
        await inTransaction((context) => migration.up(context), async (transaction) => {
          await sequelize.query('INSERT INTO migrations (name) VALUES (:name)', { replacements: { name: migration.name }, transaction });
        });
      },
      down: async () => {
        onStep?.(`Taking back: ${migration.name}`);
        await inTransaction((context) => migration.down(context), async (transaction) => {
          await sequelize.query('DELETE FROM migrations WHERE name = :name', { replacements: { name: migration.name }, transaction });
        });
      },
    })),
  });
}

/** Reads what has been applied; each step records itself inside its own transaction. */
class MigrationTable implements UmzugStorage {
  private readonly sequelize: Sequelize;

  constructor(sequelize: Sequelize) {
    this.sequelize = sequelize;
  }

  async logMigration(): Promise<void> {}

  async unlogMigration(): Promise<void> {}

  async executed(): Promise<string[]> {
    await this.sequelize.query(
      `CREATE TABLE IF NOT EXISTS migrations (name text PRIMARY KEY, applied_at timestamptz NOT NULL DEFAULT now());
       GRANT SELECT ON migrations TO ${RUNTIME_ROLE}`,
    );
    return executedNames(this.sequelize);
  }
}

async function executedNames(sequelize: Sequelize): Promise<string[]> {
  const rows = await sequelize.query<{ name: string }>('SELECT name FROM migrations ORDER BY name', { type: QueryTypes.SELECT });
  return rows.map((row) => row.name);
}

async function ensureRuntimeRole(sequelize: Sequelize): Promise<void> {
  const [state] = await sequelize.query<{ exists: boolean; member: boolean; login: string; database: string }>(
    `SELECT r.oid IS NOT NULL AS exists, coalesce(pg_has_role(current_user, r.oid, 'MEMBER'), false) AS member,
            current_user AS login, current_database() AS database
     FROM (SELECT 1) AS one LEFT JOIN pg_roles r ON r.rolname = '${RUNTIME_ROLE}'`,
    { type: QueryTypes.SELECT },
  );
  if (state === undefined) throw new Error('The database did not answer a query about its roles.');
  const quoted = `"${state.login.replaceAll('"', '""')}"`;
  try {
    if (!state.exists) await sequelize.query(`CREATE ROLE ${RUNTIME_ROLE} NOLOGIN`);
    if (!state.member) await sequelize.query(`GRANT ${RUNTIME_ROLE} TO ${quoted}`);
  } catch (cause) {
    throw new Error(
      `The database account ${state.login} may not create the role ${RUNTIME_ROLE}, which requests run as. ` +
        `Ask a database administrator to run: CREATE ROLE ${RUNTIME_ROLE} NOLOGIN; GRANT ${RUNTIME_ROLE} TO ${quoted};`,
      { cause },
    );
  }
  await sequelize.query(`GRANT USAGE ON SCHEMA public TO ${RUNTIME_ROLE}`);
}

/** Creates or upgrades the queue's own schema and lets the runtime role enqueue. */
async function installQueue(url: string, sequelize: Sequelize): Promise<void> {
  const boss = new PgBoss({ connectionString: url, schema: QUEUE_SCHEMA, supervise: false, schedule: false, max: 2 });
  const problems: unknown[] = [];
  boss.on('error', (error) => problems.push(error));
  await boss.start();
  await boss.createQueue(QUEUE);
  await boss.stop({ graceful: false, wait: true });
  if (problems.length > 0) throw new Error('The job queue could not be installed in the database.', { cause: problems[0] });
  await sequelize.query(
    `GRANT USAGE ON SCHEMA ${QUEUE_SCHEMA} TO ${RUNTIME_ROLE};
     GRANT SELECT, INSERT, UPDATE, DELETE ON ALL TABLES IN SCHEMA ${QUEUE_SCHEMA} TO ${RUNTIME_ROLE};
     GRANT EXECUTE ON ALL FUNCTIONS IN SCHEMA ${QUEUE_SCHEMA} TO ${RUNTIME_ROLE}`,
  );
}
