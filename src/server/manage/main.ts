import { ConnectionError } from 'sequelize';

import { migrateDatabase, revertDatabase } from '#db/migrate.ts';

/** Maintenance of the database from a terminal: `prepare` (before a start), `migrate`, `revert [steps]`. Exit code 1 with one line when it fails. */
async function run(command: string | undefined, argument: string | undefined): Promise<void> {
  const url = process.env['DATABASE_URL'];
  if (!url) throw new Error('DATABASE_URL is not set: give the address of the database.');
  const say = (message: string) => console.log(message);
  switch (command) {
    case 'prepare':
    case 'migrate':
      await migrateDatabase({ url, onStep: say });
      return;
    case 'revert':
      await revertDatabase({ url, onStep: say, ...(argument !== undefined && { steps: Number(argument) }) });
      return;
    default:
      throw new Error('Give one of: prepare, migrate, revert [steps].');
  }
}

function explain(error: unknown): string {
  if (error instanceof ConnectionError) {
    const cause = error.original as Error & { code?: string };
    return `The database of DATABASE_URL cannot be reached: ${error.message || cause.message || cause.code}. Check the address, the password, and that the server runs.`;
  }
  return error instanceof Error ? error.message : String(error);
}

try {
  await run(process.argv[2], process.argv[3]);
} catch (error) {
  console.error(explain(error));
  if (process.env['SELVAGE_LOG_LEVEL'] === 'debug') console.error(error);
  process.exitCode = 1;
}
