import { hostname } from 'node:os';

import type PgBoss from 'pg-boss';

import { QUEUE } from '#db/migrate.ts';
import { closeDatabase, getDatabase } from '#server/database.ts';
import { EnvError, getEnv } from '#server/env.ts';
import { EXPIRE_SECONDS, type JobMessage, startQueue } from '#server/jobs/queue.ts';
import { getLog } from '#server/log.ts';

import { registry } from './registry.ts';
import { failLostJobs, JobHandedBack, runJob } from './run-job.ts';
import { closeThreads } from './threads.ts';

/** Jobs that one worker runs at once: numerics run in threads, so that more would only share them. */
const SLOTS = 2;

const log = getLog();

/** Moves the expiry of a running message away from now, so that only a dead worker's message expires. */
const keepAlive = async (messageId: string): Promise<void> => {
  await getDatabase().query(
    `UPDATE pgboss.job SET expire_in = make_interval(secs => extract(epoch FROM now() - started_on) + ${EXPIRE_SECONDS})
     WHERE name = '${QUEUE}' AND id = :messageId AND state = 'active'`,
    { replacements: { messageId } },
  );
};

const main = async (): Promise<void> => {
  getEnv();
  getDatabase();
  const stopping = new AbortController();
  const boss: PgBoss = await startQueue(true);
  for (let slot = 0; slot < SLOTS; slot++)
    await boss.work<JobMessage>(QUEUE, { batchSize: 1, pollingIntervalSeconds: 0.5 }, async ([message]) => {
      if (!message) return;
      let lastAlive = 0;
      await runJob(message.data.jobId, {
        registry,
        log,
        stopping: stopping.signal,
        onAlive: async () => {
          if (Date.now() - lastAlive < (EXPIRE_SECONDS * 1000) / 6) return;
          lastAlive = Date.now();
          await keepAlive(message.id);
        },
      });
    });
  const sweep = setInterval(() => {
    failLostJobs().catch((error: unknown) => log.warn({ err: error }, 'Lost jobs could not be looked for'));
  }, 60_000);
  log.info({ host: hostname(), slots: SLOTS }, 'Worker ready');

  const stop = async (signal: string): Promise<void> => {
    if (stopping.signal.aborted) return;
    log.info({ signal }, 'Worker stopping');
    clearInterval(sweep);
    stopping.abort(new JobHandedBack());
    await boss.stop({ graceful: true, wait: true, timeout: 10_000 });
    await closeThreads();
    await closeDatabase();
    process.exit(0);
  };
  for (const signal of ['SIGTERM', 'SIGINT'] as const) process.on(signal, () => void stop(signal));
};

main().catch((error: unknown) => {
  if (error instanceof EnvError) process.stderr.write(`${error.message}\n`);
  else log.fatal({ err: error }, 'The worker could not start');
  process.exit(1);
});
