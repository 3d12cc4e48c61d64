// `npm start`: everything from a fresh clone to a listening server, and back.
import fs from 'node:fs';
import path from 'node:path';

import { StartError } from '../../db/private-postgres.js';
import { ensureBuild } from './build.js';
import { createPrinter } from './printer.js';
import { childEnvironment, manage, openDatabase } from './prepare.js';
import { onStopSignal, Processes, waitFor } from './processes.js';
import { checkNode, ensurePackages } from './requirements.js';
import { choosePort, dataFolder, DEMO_ACCOUNTS, lockFolder } from './settings.js';

const say = (message) => console.log(message);

async function main() {
  checkNode();
  ensurePackages(say);
  const folder = dataFolder();
  const lock = lockFolder(folder);
  const processes = new Processes((name, how) => {
    console.error(`The ${name} ended unexpectedly (${how}); stopping the rest.`);
    void finish(1);
  });
  processes.afterwards(async () => lock.release());
  let finishing;
  const finish = (code) => (finishing ??= processes.stop().then(() => process.exit(code)));
  onStopSignal(
    (signal) => {
      say(`Stopping (${signal}) ...`);
      void finish(0);
    },
    () => {
      processes.kill();
      process.exit(1);
    },
  );
  try {
    const database = await openDatabase({ folder, say });
    processes.afterwards(database.stop);
    void database.exited?.then((how) => {
      if (processes.stopping) return;
      console.error(`PostgreSQL ended unexpectedly (${how}); stopping the rest.`);
      void finish(1);
    });
    const build = await ensureBuild(say);
    if (processes.stopping) return;
    await serve({ folder, build, database, processes, lock });
  } catch (error) {
    console.error(error instanceof StartError ? error.message : error);
    await finish(1);
  }
}

async function serve({ folder, build, database, processes, lock }) {
  const { port, wanted } = await choosePort();
  if (port !== wanted) say(`Port ${wanted} is taken; using ${port}.`);
  const env = { ...childEnvironment({ folder, url: database.url, port }), NODE_ENV: 'production' };
  manage([path.join(build, 'worker/manage.js'), 'prepare'], env);
  const onLine = createPrinter();
  const web = processes.node('web server', ['--enable-source-maps', path.join(build, 'web.js')], { env, onLine });
  const worker = path.join(build, 'worker/main.js');
  if (fs.existsSync(worker)) processes.node('worker', ['--enable-source-maps', worker], { env, onLine, patience: 30_000 });
  const host = ['0.0.0.0', '::'].includes(env.HOST) ? '127.0.0.1' : env.HOST;
  const url = `http://${host.includes(':') ? `[${host}]` : host}:${port}`;
  if (!(await waitFor(`${url}/readyz`, { isOver: () => processes.stopping }))) {
    if (processes.stopping) return;
    throw new StartError(`The web server did not answer at ${url}/readyz within a minute (process ${web.child.pid}). What it logged stands above.`);
  }
  lock.note(url);
  say('');
  say(`  Selvage is ready: ${url}`);
  say('');
  say('  Demo sign-ins (invented people and synthetic data):');
  for (const account of DEMO_ACCOUNTS) say(`    ${account}`);
  say(`  Password of all four: ${env.SELVAGE_DEMO_PASSWORD}`);
  say('');
  say('  Ctrl-C stops everything.');
  say('');
}

main().catch((error) => {
  console.error(error instanceof StartError ? error.message : error);
  process.exit(1);
});
