import { spawnSync } from 'node:child_process';
import fs from 'node:fs';
import net from 'node:net';
import path from 'node:path';

import { afterEach, describe, expect, it } from 'vitest';

import { launch, type Launched, livingOf, makeDataFolder, ROOT } from '#support/launcher.ts';
import { createTestDatabase } from '#support/test-database.ts';

import { freePort } from '../../../db/private-postgres.js';

const started: { launched: Launched[]; removals: (() => void)[] } = { launched: [], removals: [] };

function start(env: Record<string, string>, options = {}): Launched {
  const launched = launch(env, options);
  started.launched.push(launched);
  return launched;
}

function dataFolder(owner?: { uid: number; gid: number }): string {
  const { folder, remove } = makeDataFolder(owner);
  started.removals.push(remove);
  return folder;
}

afterEach(async () => {
  for (const one of started.launched.splice(0)) {
    one.child.kill('SIGTERM');
    await one.exited;
  }
  for (const remove of started.removals.splice(0)) remove();
});

const passwordIn = (text: string) => /Password of all four: (\S+)/.exec(text)?.[1];

describe('npm start', { timeout: 300_000 }, () => {
  it('takes the next port when the wanted one is taken, says so, prints the sign-ins, and leaves nothing behind', async () => {
    const port = await freePort();
    const blocker = net.createServer().listen(port, '127.0.0.1');
    const folder = dataFolder();
    const launched = start({ SELVAGE_DATA_DIR: folder, PORT: String(port) });
    const url = await launched.ready();
    blocker.close();
    expect(launched.output()).toContain(`Port ${port} is taken; using ${new URL(url).port}.`);
    expect(Number(new URL(url).port)).toBeGreaterThan(port);
    for (const name of ['viewer', 'designer', 'reviewer', 'admin']) await expect.poll(launched.output).toContain(`${name}@selvage.example`);
    await expect.poll(() => passwordIn(launched.output())?.length).toBeGreaterThanOrEqual(12);
    expect(await (await fetch(`${url}/readyz`)).json()).toEqual({ ready: true, database: 'ok', migrations: 'ok' });
    for (const name of ['secrets.json', 'database-passwords.json']) expect(fs.statSync(path.join(folder, name)).mode & 0o777).toBe(0o600);

    const second = start({ SELVAGE_DATA_DIR: folder });
    expect(await second.exited).toBe(1);
    expect(second.output()).toContain(`already runs on the data in ${folder}, at ${url}`);

    const all = launched.descendants();
    expect(all.length).toBeGreaterThanOrEqual(2);
    launched.child.kill('SIGTERM');
    expect(await launched.exited).toBe(0);
    expect(livingOf(all)).toEqual([]);
    expect(fs.existsSync(path.join(folder, 'postgres/postmaster.pid'))).toBe(false);
  });

  it('survives being killed: nothing lives on, and the next start keeps data and password', async () => {
    const env = { SELVAGE_DATA_DIR: dataFolder(), PORT: String(await freePort()) };
    const first = start(env);
    await first.ready();
    await expect.poll(() => passwordIn(first.output())).toBeDefined();
    const all = first.descendants();
    first.child.kill('SIGKILL');
    await first.exited;
    await expect.poll(() => livingOf(all), { timeout: 15_000 }).toEqual([]);
    const next = start(env);
    await next.ready();
    await expect.poll(() => passwordIn(next.output())).toBe(passwordIn(first.output()));
  });

  it('stops the rest and says so when the web server dies', async () => {
    const launched = start({ SELVAGE_DATA_DIR: dataFolder(), PORT: String(await freePort()) });
    await launched.ready();
    const all = launched.descendants();
    const web = all.find((pid) => livingOf([pid]).some((line) => /web\.js/.test(line)));
    process.kill(web!, 'SIGKILL');
    expect(await launched.exited).toBe(1);
    expect(launched.output()).toContain('The web server ended unexpectedly (signal SIGKILL); stopping the rest.');
    expect(livingOf(all)).toEqual([]);
  });

  it('uses the server of DATABASE_URL and starts none', async () => {
    const database = await createTestDatabase({ empty: true });
    try {
      const launched = start({ SELVAGE_DATA_DIR: dataFolder(), PORT: String(await freePort()), DATABASE_URL: database.url });
      await launched.ready();
      expect(livingOf(launched.descendants()).filter((line) => /postgres /.test(line))).toEqual([]);
      const [row] = await database.query<{ count: string }>('SELECT count(*) FROM pg_stat_activity WHERE datname = $1 AND pid <> pg_backend_pid()', [database.name]);
      expect(Number(row?.count)).toBeGreaterThan(0);
      launched.child.kill('SIGTERM');
      expect(await launched.exited).toBe(0);
    } finally {
      await database.drop();
    }
  });

  it('stops with one line when the database of DATABASE_URL cannot be reached', async () => {
    const launched = start({ SELVAGE_DATA_DIR: dataFolder(), DATABASE_URL: `postgres://a:b@127.0.0.1:${await freePort()}/x` });
    expect(await launched.exited).toBe(1);
    expect(launched.output()).toMatch(/^The database of DATABASE_URL cannot be reached: .*ECONNREFUSED/m);
    expect(launched.output()).not.toMatch(/^ +at /m);
  });

  // Needs an account without rights that may read the checkout.
  const nobody = { uid: 65534, gid: 65534 };
  const isRootWithOpenCheckout = process.getuid?.() === 0 && ancestors(ROOT).every((folder) => (fs.statSync(folder).mode & 0o005) === 0o005);
  it.runIf(isRootWithOpenCheckout)('works for an ordinary user', async () => {
    const folder = dataFolder(nobody);
    const launched = start({ SELVAGE_DATA_DIR: folder, HOME: folder, PORT: String(await freePort()) }, nobody);
    const url = await launched.ready();
    expect((await fetch(`${url}/readyz`)).status).toBe(200);
    launched.child.kill('SIGINT');
    expect(await launched.exited).toBe(0);
  });

  it.runIf(isRootWithOpenCheckout)('names the package to ask for when an ordinary user has no PostgreSQL', () => {
    const program = `import { ensurePostgres } from ${JSON.stringify(path.join(ROOT, 'src/launch/requirements.js'))};
      try { ensurePostgres(() => {}, () => []); } catch (error) { console.log(error.name, error.message); }`;
    const run = spawnSync(process.execPath, ['--input-type=module', '-e', program], { ...nobody, cwd: '/', encoding: 'utf8' });
    expect(run.stdout.trim()).toBe(
      'StartError PostgreSQL is missing and this account may not install packages. Ask an administrator to run: apt-get install --no-install-recommends postgresql',
    );
  });
});

function ancestors(folder: string): string[] {
  const parent = path.dirname(folder);
  return parent === folder ? [folder] : [folder, ...ancestors(parent)];
}
