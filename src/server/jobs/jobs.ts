import { Op, type Transaction } from 'sequelize';

import { JobRow } from '#db/models/JobRow.ts';
import type { Job, JobKind } from '#schemas/jobs.ts';
import type { List, ListQuery } from '#schemas/list.ts';

import type { Context } from '../context.ts';
import { getDatabase } from '../database.ts';
import { AppError, notFound } from '../errors.ts';
import { removeUnreadFiles } from '../observations/store-upload.ts';
import { afterCursor, pageOf, requireId } from '../pages-of-lists.ts';
import { type Action, authorize } from '../policies.ts';
import { sendMessage } from './queue.ts';

export const FINAL_STATES = ['complete', 'failed', 'cancelled'] as const;

/** Whether a job has ended and will not change any more. */
export const isFinal = (state: string): boolean => (FINAL_STATES as readonly string[]).includes(state);

export const presentJob = (job: JobRow): Job => ({
  id: job.id,
  kind: job.kind,
  state: job.state,
  progress: { fraction: job.fraction, phase: job.phase },
  result: job.result,
  error: job.error,
  createdAt: job.createdAt.toISOString(),
  startedAt: job.startedAt?.toISOString() ?? null,
  finishedAt: job.finishedAt?.toISOString() ?? null,
});

export interface NewJob {
  kind: JobKind;
  teamId: string;
  payload: Record<string, unknown>;
  /** The job exists when this commits. */
  transaction: Transaction;
}

/** Writes a job's row and its message in one transaction. The caller has authorised the person. */
export const enqueueJob = async (ctx: Context, { kind, teamId, payload, transaction }: NewJob): Promise<Job> => {
  const job = await JobRow.create({ kind, teamId, payload, userId: ctx.actor?.userId ?? null }, { transaction });
  await sendMessage({ jobId: job.id }, transaction);
  await job.reload({ transaction });
  return presentJob(job);
};

const loadJob = async (ctx: Context, jobId: string | undefined, action: Action): Promise<JobRow> => {
  const id = requireId(jobId, 'job');
  getDatabase();
  const job = await JobRow.findByPk(id);
  authorize(ctx, action, job?.teamId ?? '', 'job');
  if (!job) throw notFound('job');
  return job;
};

/** One job as it stands. @throws AppError NOT_FOUND */
export const getJob = async (ctx: Context, jobId: string | undefined): Promise<Job> => presentJob(await loadJob(ctx, jobId, 'job.read'));

/** Jobs of a team, newest first. */
export const listJobs = async (ctx: Context, teamId: string | undefined, query: ListQuery): Promise<List<Job>> => {
  const id = requireId(teamId, 'team');
  authorize(ctx, 'job.read', id, 'team');
  const rows = await JobRow.findAll({
    where: { teamId: id, ...afterCursor(query.cursor, 'createdAt') },
    order: [['createdAt', 'DESC'], ['id', 'ASC']],
    limit: query.limit + 1,
  });
  return pageOf(rows, query.limit, (row) => row.createdAt, presentJob);
};

/** Cancels a job: at once while it waits, within about a second while it runs. @throws AppError JOB_FINISHED */
export const cancelJob = async (ctx: Context, jobId: string | undefined): Promise<Job> => {
  const job = await loadJob(ctx, jobId, 'job.control');
  const [waiting] = await JobRow.update(
    { state: 'cancelled', cancelRequested: true, finishedAt: new Date(), phase: 'cancelled' },
    { where: { id: job.id, state: { [Op.in]: ['queued', 'paused'] } } },
  );
  if (waiting === 0) {
    const [running] = await JobRow.update({ cancelRequested: true }, { where: { id: job.id, state: 'running' } });
    if (running === 0) throw new AppError('JOB_FINISHED', 'This job has already ended, so there is nothing to cancel.');
  } else if (job.kind === 'read-observations') await removeUnreadFiles();
  await job.reload();
  return presentJob(job);
};
