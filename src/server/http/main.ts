import { EnvError, getEnv } from '../env.ts';
import { getLog } from '../log.ts';
import { type AppHandler, createWebServer } from './server.ts';

/** How long requests under way may take to finish after SIGTERM. */
const GRACE_MS = 10_000;

const log = getLog();

process.on('uncaughtException', (error) => {
  log.fatal({ err: error }, 'Uncaught error; the web server ends');
  process.exit(1);
});

try {
  const env = getEnv();
  process.env['ASTRO_NODE_AUTOSTART'] = 'disabled';
  const entry = new URL('./server/entry.mjs', import.meta.url);
  const { handler } = (await import(entry.href)) as { handler: AppHandler };
  const web = createWebServer(handler, env, log);
  const port = await web.listen();
  log.info({ host: env.host, port }, 'Web server listening');
  let isStopping = false;
  for (const signal of ['SIGTERM', 'SIGINT'] as const) {
    process.on(signal, () => {
      if (isStopping) return;
      isStopping = true;
      log.info({ signal }, 'Web server draining');
      void web.drain(GRACE_MS).then(() => {
        log.info('Web server ended');
        process.exit(0);
      });
    });
  }
} catch (error) {
  if (error instanceof EnvError) console.error(error.message);
  else log.fatal({ err: error }, 'The web server could not start');
  process.exit(1);
}
