import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';

import type { TestProject } from 'vitest/node';

import { migrateDatabase } from '#db/migrate.ts';

import { isAlive, openPrivatePostgres } from '../../db/private-postgres.js';

declare module 'vitest' {
  export interface ProvidedContext {
    /** The migrated template database: as its owner, and as superuser. */
    database: { url: string; adminUrl: string };
  }
}

const PREFIX = 'selvage-test-';

/** Starts the throw-away cluster of this run and migrates the template that each test database is cloned from. */
export default async function setup(project: TestProject): Promise<() => Promise<void>> {
  removeAbandoned();
  const folder = path.join(os.tmpdir(), `${PREFIX}${process.pid}`);
  fs.mkdirSync(folder, { mode: 0o711 });
  const server = await openPrivatePostgres({ folder, throwaway: true });
  await migrateDatabase({ url: server.url });
  project.provide('database', { url: server.url, adminUrl: server.adminUrl });
  return async () => {
    await server.stop();
    fs.rmSync(folder, { recursive: true, force: true });
  };
}

/** Folders of runs that were killed. */
function removeAbandoned(): void {
  for (const name of fs.readdirSync(os.tmpdir())) {
    const pid = name.startsWith(PREFIX) ? Number(name.slice(PREFIX.length)) : Number.NaN;
    if (Number.isInteger(pid) && !isAlive(pid)) fs.rmSync(path.join(os.tmpdir(), name), { recursive: true, force: true });
  }
}
