// `npm run worker`: one more worker, on this or another machine, for the database of DATABASE_URL.
import path from 'node:path';

import { StartError } from '../../db/private-postgres.js';
import { ensureBuild } from './build.js';
import { createPrinter } from './printer.js';
import { onStopSignal, Processes } from './processes.js';
import { checkNode, ensurePackages } from './requirements.js';
import { dataFolder, keepSecrets } from './settings.js';

async function main() {
  checkNode();
  if (!process.env.DATABASE_URL) throw new StartError('DATABASE_URL is not set: give the address of the database that the web server uses.');
  ensurePackages(console.error);
  const build = await ensureBuild(console.error);
  let code = 0;
  const processes = new Processes((_name, how) => {
    console.error(`The worker ended unexpectedly (${how}).`);
    process.exit(1);
  });
  const { sessionSecret } = keepSecrets(dataFolder());
  const env = { SELVAGE_SESSION_SECRET: sessionSecret, NODE_ENV: 'production' };
  const worker = processes.node('worker', ['--enable-source-maps', path.join(build, 'worker/main.js')], { env, onLine: createPrinter(), patience: 30_000 });
  onStopSignal(() => void processes.stop(), () => { code = 1; processes.kill(); });
  await worker.exited;
  process.exit(code);
}

main().catch((error) => {
  console.error(error instanceof StartError ? error.message : error);
  process.exit(1);
});
