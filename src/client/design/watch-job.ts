import type { Job } from '#schemas/jobs.ts';

import { getJob } from './design-api.ts';

const POLL_MS = 700;
const QUIET_MS = 4000;

export const isOver = (job: Job): boolean => job.state === 'complete' || job.state === 'failed' || job.state === 'cancelled';

/** Follows a job by server-sent events, and by asking where those stay away, until it is over or `destroy` is called. */
export const watchJob = (id: string, onJob: (job: Job) => void, onLost: (message: string) => void): { destroy(): void } => {
  let isDone = false;
  let source: EventSource | null = null;
  let timer: ReturnType<typeof setTimeout> | undefined;
  let failures = 0;

  const stop = (): void => {
    isDone = true;
    clearTimeout(timer);
    source?.close();
  };
  const take = (job: Job): void => {
    if (isDone) return;
    if (isOver(job)) stop();
    onJob(job);
  };
  const poll = async (): Promise<void> => {
    if (isDone) return;
    try {
      take(await getJob(id));
      failures = 0;
    } catch (error) {
      failures++;
      if (failures === 5) onLost(error instanceof Error ? error.message : String(error));
    }
    if (!isDone) timer = setTimeout(() => void poll(), source ? QUIET_MS : POLL_MS * Math.min(8, 1 + failures));
  };
  const handleMessage = ({ data }: MessageEvent<string>): void => {
    try {
      const job = JSON.parse(data) as Job;
      if (job.id === id) take(job);
    } catch {
      // an event of another shape is left to polling
    }
  };
  source = new EventSource(`/api/v1/jobs/${id}/events`);
  source.addEventListener('message', handleMessage);
  source.addEventListener('job', handleMessage);
  source.addEventListener('error', () => {
    source?.close();
    source = null;
    clearTimeout(timer);
    if (!isDone) void poll();
  });
  void poll();
  return { destroy: stop };
};
