import { afterAll, beforeAll, describe, expect, it } from 'vitest';

import { connect } from '#db/connect.ts';
import { migrateDatabase, pendingMigrations, revertDatabase } from '#db/migrate.ts';
import { migrations } from '#db/migrations/index.ts';
import { createTestDatabase, type TestDatabase } from '#support/test-database.ts';

describe('migrations', () => {
  let database: TestDatabase;
  beforeAll(async () => {
    database = await createTestDatabase({ empty: true });
  });
  afterAll(() => database.drop());

  const catalogue = () =>
    database.query<{ thing: string }>(
      `SELECT format('%s %s.%s %s %s', table_name, column_name, data_type, is_nullable, column_default) AS thing
         FROM information_schema.columns WHERE table_schema = 'public' AND table_name <> 'migrations'
       UNION ALL SELECT indexdef FROM pg_indexes WHERE schemaname = 'public' AND tablename <> 'migrations'
       UNION ALL SELECT format('%s %s', conrelid::regclass, pg_get_constraintdef(oid)) FROM pg_constraint
         WHERE connamespace = 'public'::regnamespace AND conrelid <> 'public.migrations'::regclass
       UNION ALL SELECT pg_get_triggerdef(oid) FROM pg_trigger WHERE NOT tgisinternal
       UNION ALL SELECT proname FROM pg_proc WHERE pronamespace = 'public'::regnamespace
       ORDER BY 1`,
    );

  it('go forward, all the way back to nothing, and forward to the same schema', async () => {
    const names = migrations.map((migration) => migration.name);
    expect(await migrateDatabase({ url: database.url })).toEqual(names);
    const schema = await catalogue();
    expect(await revertDatabase({ url: database.url })).toEqual([...names].reverse());
    expect(await catalogue()).toEqual([]);
    expect(await migrateDatabase({ url: database.url })).toEqual(names);
    expect(await catalogue()).toEqual(schema);
  });

  it('are applied once when two servers start together', async () => {
    const other = await createTestDatabase({ empty: true });
    try {
      const runs = await Promise.all([migrateDatabase({ url: other.url }), migrateDatabase({ url: other.url })]);
      expect(runs.map((run) => run.length).sort((a, b) => a - b)).toEqual([0, migrations.length]);
    } finally {
      await other.drop();
    }
  });

  it('leave the runtime role able to read what is pending, and nothing pending', async () => {
    const sequelize = connect({ url: database.url });
    try {
      const [rows] = await sequelize.query('SELECT current_user AS role');
      expect(rows).toEqual([{ role: 'selvage_runtime' }]);
      expect(await pendingMigrations(sequelize)).toEqual([]);
      await expect(sequelize.query('DELETE FROM migrations')).rejects.toThrow(/permission denied/);
    } finally {
      await sequelize.close();
    }
  });

  it('say what an administrator has to run when the account may not create the runtime role', async () => {
    const other = await createTestDatabase({ empty: true });
    const login = `${other.name}_owner`;
    try {
      await other.query(`CREATE ROLE ${login} LOGIN PASSWORD 'x'`);
      await other.query(`ALTER DATABASE ${other.name} OWNER TO ${login}`);
      const url = new URL(other.url);
      url.username = login;
      url.password = 'x';
      await expect(migrateDatabase({ url: url.href })).rejects.toThrow(`GRANT selvage_runtime TO "${login}";`);
      await other.query(`GRANT selvage_runtime TO ${login}`);
      await other.query(`ALTER SCHEMA public OWNER TO ${login}`);
      expect(await migrateDatabase({ url: url.href })).toEqual(migrations.map((migration) => migration.name));
    } finally {
      await other.drop();
      await database.query(`DROP ROLE IF EXISTS ${login}`);
    }
  });

  it('have names that sort in the order in which they run', () => {
    const names = migrations.map((migration) => migration.name);
    expect(names).toEqual([...names].sort());
    expect(new Set(names).size).toBe(names.length);
  });
});
