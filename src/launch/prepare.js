// What `npm start` and `npm run dev` have in common: a database, its address and the settings of the processes.
import { spawnSync } from 'node:child_process';

import { openPrivatePostgres, StartError } from '../../db/private-postgres.js';
import { ensurePostgres } from './requirements.js';
import { keepSecrets, ROOT } from './settings.js';

/**
 * Starts the private PostgreSQL, or takes the server that DATABASE_URL names.
 * @param {{ folder: string, say: (message: string) => void }} options
 * @returns {Promise<{ url: string, adminUrl?: string, exited?: Promise<string>, stop: () => Promise<void> }>}
 */
export async function openDatabase({ folder, say }) {
  if (process.env.DATABASE_URL) {
    say('Using the PostgreSQL server of DATABASE_URL.');
    return { url: process.env.DATABASE_URL, stop: async () => {} };
  }
  ensurePostgres(say);
  return openPrivatePostgres({ folder, throwaway: process.env.SELVAGE_THROWAWAY === '1', onNotice: say });
}

/** Environment of the web server, the worker and the maintenance commands. */
export function childEnvironment({ folder, url, port }) {
  const secrets = keepSecrets(folder);
  return {
    DATABASE_URL: url,
    PORT: String(port),
    HOST: process.env.HOST || '127.0.0.1',
    SELVAGE_DATA_DIR: folder,
    SELVAGE_SESSION_SECRET: secrets.sessionSecret,
    SELVAGE_DEMO_PASSWORD: secrets.demoPassword,
  };
}

/** Runs a maintenance command to its end. @throws {StartError} with what it said */
export function manage(args, env) {
  const run = spawnSync(process.execPath, args, { cwd: ROOT, env: { ...process.env, ...env }, encoding: 'utf8' });
  if (run.stdout) process.stdout.write(run.stdout);
  if (run.status !== 0) throw new StartError(run.stderr.trim() || `${args.at(-1)} failed (${run.status ?? run.signal}).`);
}
