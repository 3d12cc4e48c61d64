// `npm run dev`: private PostgreSQL, Astro's development server, and the worker straight from its sources.
import fs from 'node:fs';
import path from 'node:path';

import { StartError } from '../../db/private-postgres.js';
import { childEnvironment, manage, openDatabase } from './prepare.js';
import { onStopSignal, Processes } from './processes.js';
import { checkNode, ensurePackages } from './requirements.js';
import { choosePort, dataFolder, DEMO_ACCOUNTS, lockFolder, ROOT } from './settings.js';

const say = (message) => console.log(message);

async function main() {
  checkNode();
  ensurePackages(say);
  const folder = dataFolder();
  const lock = lockFolder(folder);
  const processes = new Processes((name, how) => {
    console.error(`The ${name} ended (${how}); stopping the rest.`);
    void finish(1);
  });
  processes.afterwards(async () => lock.release());
  let finishing;
  const finish = (code) => (finishing ??= processes.stop().then(() => process.exit(code)));
  onStopSignal(() => void finish(0), () => { processes.kill(); process.exit(1); });
  try {
    const database = await openDatabase({ folder, say });
    processes.afterwards(database.stop);
    void database.exited?.then((how) => { if (!processes.stopping) { console.error(`PostgreSQL ended (${how}).`); void finish(1); } });
    const { port, wanted } = await choosePort();
    if (port !== wanted) say(`Port ${wanted} is taken; using ${port}.`);
    const env = childEnvironment({ folder, url: database.url, port });
    const tsx = ['--import', 'tsx'];
    manage([...tsx, 'src/worker/manage/main.ts', 'prepare'], env);
    lock.note(`http://127.0.0.1:${port}`);
    processes.node('web server', ['node_modules/astro/astro.js', 'dev', '--port', String(port), '--host', env.HOST], { env: { ...env, ASTRO_TELEMETRY_DISABLED: '1', ASTRO_DISABLE_UPDATE_CHECK: 'true' }, patience: 3_000 });
    if (fs.existsSync(path.join(ROOT, 'src/worker/main.ts'))) processes.node('worker', [...tsx, 'src/worker/main.ts'], { env });
    say(`Selvage (development): http://${env.HOST}:${port}   sign-ins: ${DEMO_ACCOUNTS.join(', ')}   password: ${env.SELVAGE_DEMO_PASSWORD}`);
  } catch (error) {
    console.error(error instanceof StartError ? error.message : error);
    await finish(1);
  }
}

main().catch((error) => {
  console.error(error instanceof StartError ? error.message : error);
  process.exit(1);
});
