import { Op, QueryTypes } from 'sequelize';

import { NumericalError } from '#core/errors.ts';
import { JobRow } from '#db/models/JobRow.ts';
import { getDatabase } from '#server/database.ts';
import { AppError } from '#server/errors.ts';
import { removeUnreadFiles } from '#server/observations/store-upload.ts';
import { toProblem } from '#server/respond.ts';
import type { Logger } from '#server/log.ts';

import type { TaskRegistry } from './task.ts';

const TICK_MS = 400;

/** A worker that stops gives its job back: thrown so that the queue hands it to another one. */
export class JobHandedBack extends Error {
  constructor() {
    super('The worker stops; the job goes to another one.');
    this.name = 'JobHandedBack';
  }
}

export interface RunOptions {
  registry: TaskRegistry;
  log: Logger;
  /** Aborted when the worker stops. */
  stopping: AbortSignal;
  /** Called at each sign of life, to keep the queue from giving the job away. */
  onAlive(): Promise<void>;
}

/** Runs the job of a row to a final state. A row that is already final, or gone, is left alone. @throws JobHandedBack */
export const runJob = async (jobId: string, { registry, log, stopping, onAlive }: RunOptions): Promise<void> => {
  const job = await JobRow.findByPk(jobId);
  if (!job) return;
  const [taken] = await JobRow.update(
    { state: 'running', startedAt: job.startedAt ?? new Date(), attempt: job.attempt + 1, heartbeatAt: new Date(), phase: 'starting', fraction: 0 },
    { where: { id: jobId, state: { [Op.in]: ['queued', 'running'] } } },
  );
  if (taken === 0) return;
  const jobLog = log.child({ jobId, kind: job.kind });
  const abort = new AbortController();
  const stop = (): void => abort.abort(new JobHandedBack());
  stopping.addEventListener('abort', stop);
  let progress = { fraction: 0, phase: 'starting' };
  let isCancelled = false;
  const tick = async (): Promise<void> => {
    const rows = await getDatabase().query<{ cancelled: boolean }>(
      `UPDATE jobs SET fraction = :fraction, phase = :phase, heartbeat_at = now()
       WHERE id = :jobId AND state = 'running' RETURNING cancel_requested AS cancelled`,
      { replacements: { jobId, ...progress }, type: QueryTypes.SELECT },
    );
    if (rows.length === 0 || rows[0].cancelled) {
      isCancelled = true;
      abort.abort(new AppError('CONFLICT', 'The job was cancelled.'));
    }
    await onAlive();
  };
  let ticking: Promise<void> = Promise.resolve();
  const timer = setInterval(() => {
    ticking = ticking.then(tick).catch((error: unknown) => jobLog.warn({ err: error }, 'Progress could not be written'));
  }, TICK_MS);
  const finish = async (values: Partial<Pick<JobRow, 'state' | 'result' | 'error' | 'phase' | 'fraction'>>): Promise<void> => {
    clearInterval(timer);
    await ticking;
    await JobRow.update({ ...values, finishedAt: new Date() }, { where: { id: jobId, state: 'running' } });
  };
  jobLog.info('Job started');
  try {
    const result = await registry[job.kind](job.payload, {
      jobId,
      teamId: job.teamId,
      userId: job.userId,
      signal: abort.signal,
      log: jobLog,
      reportProgress: (fraction, phase) => {
        progress = { fraction: Math.min(1, Math.max(0, fraction)), phase };
      },
    });
    await finish({ state: 'complete', result, fraction: 1, phase: 'complete' });
    jobLog.info('Job complete');
  } catch (error) {
    if (stopping.aborted && !isCancelled) {
      clearInterval(timer);
      await ticking;
      await JobRow.update({ state: 'queued', phase: 'waiting for a worker' }, { where: { id: jobId, state: 'running' } });
      throw new JobHandedBack();
    }
    if (isCancelled) {
      await finish({ state: 'cancelled', phase: 'cancelled' });
      jobLog.info('Job cancelled');
      return;
    }
    const isKnown = error instanceof AppError || error instanceof NumericalError;
    if (isKnown) jobLog.info({ code: error.code }, 'Job failed');
    else jobLog.error({ err: error }, 'Job failed');
    const { problem } = toProblem(error);
    await finish({
      state: 'failed',
      phase: 'failed',
      error: { code: problem.code, message: isKnown ? problem.detail : 'Something failed in the worker. Try again; if it fails again, tell your administrator.', ...(problem.details && { details: problem.details }) },
    });
  } finally {
    clearInterval(timer);
    stopping.removeEventListener('abort', stop);
  }
};

/** Minutes without a sign of life after which a running job counts as lost: the queue has given up on it long before. */
const LOST_MINUTES = 10;

/** Fails jobs that no worker has carried on, so that nobody waits for them, and removes what they leave. Returns how many. */
export const failLostJobs = async (): Promise<number> => {
  const [count] = await JobRow.update(
    {
      state: 'failed',
      phase: 'failed',
      finishedAt: new Date(),
      error: { code: 'WORKER_LOST', message: 'The workers that took this job ended before it was done. Start it again; if it fails again, tell your administrator.' },
    },
    { where: { state: 'running', heartbeatAt: { [Op.lt]: new Date(Date.now() - LOST_MINUTES * 60_000) } } },
  );
  await removeUnreadFiles();
  return count;
};
