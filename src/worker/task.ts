import type { JobKind } from '#schemas/jobs.ts';
import type { Logger } from '#server/log.ts';

/** What a task gets beside its payload. */
export interface TaskContext {
  jobId: string;
  teamId: string;
  /** Who asked for it; null when the account is gone. */
  userId: string | null;
  /** Aborted when the job is cancelled or the worker stops. */
  signal: AbortSignal;
  /** Share done (0 to 1) and what is being done; written at most a few times a second. */
  reportProgress(fraction: number, phase: string): void;
  log: Logger;
}

/** One kind of job. Running one twice does no harm: a worker may die after the work and before the note of it. */
export type Task = (payload: Record<string, unknown>, context: TaskContext) => Promise<Record<string, unknown>>;

export type TaskRegistry = Record<JobKind, Task>;
