import { randomBytes } from 'node:crypto';

import pg from 'pg';
import { inject } from 'vitest';

export interface TestDatabase {
  /** Address as the owner, what DATABASE_URL holds. */
  url: string;
  /** Address as superuser, for tests of what even the owner's tables refuse. */
  adminUrl: string;
  name: string;
  /** Runs one statement as superuser and returns its rows. */
  query<Row extends pg.QueryResultRow = pg.QueryResultRow>(sql: string, values?: unknown[]): Promise<Row[]>;
  /** Drops the database, cutting off whoever is still connected. */
  drop(): Promise<void>;
}

/**
 * A database of its own for one test file, cloned from the migrated template.
 * `const database = await createTestDatabase(); afterAll(() => database.drop());`
 */
export async function createTestDatabase(options: { empty?: boolean } = {}): Promise<TestDatabase> {
  const template = inject('database');
  const name = `test_${randomBytes(6).toString('hex')}`;
  const maintenance = withDatabase(template.adminUrl, 'postgres');
  await run(maintenance, `CREATE DATABASE ${name} OWNER selvage_owner TEMPLATE ${options.empty === true ? 'template0' : 'selvage'}`);
  const adminUrl = withDatabase(template.adminUrl, name);
  return {
    url: withDatabase(template.url, name),
    adminUrl,
    name,
    query: (sql, values) => run(adminUrl, sql, values),
    drop: async () => void (await run(maintenance, `DROP DATABASE IF EXISTS ${name} WITH (FORCE)`)),
  };
}

async function run<Row extends pg.QueryResultRow>(url: string, sql: string, values: unknown[] = []): Promise<Row[]> {
  const client = new pg.Client({ connectionString: url });
  await client.connect();
  try {
    return (await client.query<Row>(sql, values)).rows;
  } finally {
    await client.end();
  }
}

function withDatabase(url: string, name: string): string {
  const changed = new URL(url);
  changed.pathname = `/${name}`;
  return changed.href;
}
