import { existsSync } from 'node:fs';
import path from 'node:path';
import { fileURLToPath } from 'node:url';

import { ConnectionError } from 'sequelize';

import { migrateDatabase, revertDatabase } from '#db/migrate.ts';
import { closeDatabase } from '#server/database.ts';
import { getEnv } from '#server/env.ts';
import { closeQueue } from '#server/jobs/queue.ts';

import { closeThreads } from '../threads.ts';
import { seedDemo } from './seed-demo.ts';

/** Maintenance of the database from a terminal: `prepare` (before a start), `migrate`, `revert [steps]`. Exit code 1 with one line when it fails. */
async function run(command: string | undefined, argument: string | undefined): Promise<void> {
  const url = process.env['DATABASE_URL'];
  if (!url) throw new Error('DATABASE_URL is not set: give the address of the database.');
  const say = (message: string) => console.log(message);
  switch (command) {
    case 'prepare':
      await migrateDatabase({ url, onStep: say });
      await prepareDemo(say);
      return;
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

/** Folder of the project: the nearest one above that has fixtures/demo. */
function demoFolder(): string {
  for (let folder = path.dirname(fileURLToPath(import.meta.url)); ; folder = path.dirname(folder)) {
    const candidate = path.join(folder, 'fixtures/demo');
    if (existsSync(candidate)) return candidate;
    if (folder === path.dirname(folder)) throw new Error('The folder fixtures/demo is missing. Restore it from the repository.');
  }
}

async function prepareDemo(say: (message: string) => void): Promise<void> {
  try {
    if (await seedDemo(getEnv().demoPassword, demoFolder())) say('Seeded the demo team (synthetic data).');
  } finally {
    await closeThreads();
    await closeQueue();
    await closeDatabase();
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
