import { useEffect, useState } from 'react';

import { cancelJob } from '#client/design/design-api.ts';
import { watchJob } from '#client/design/watch-job.ts';
import { formatElapsed } from '#client/format.ts';
import type { Job } from '#schemas/jobs.ts';

interface JobProgressProps {
  job: Job;
  /** Called once when the job has ended, however it ended. */
  onEnd: (job: Job) => void;
}

/** A running job: phase, share done, time so far, and a way to cancel it. */
export const JobProgress = ({ job: first, onEnd }: JobProgressProps) => {
  const [job, setJob] = useState(first);
  const [now, setNow] = useState(() => Date.now());
  const [lost, setLost] = useState<string | null>(null);
  const [isCancelling, setCancelling] = useState(false);

  useEffect(() => {
    const watch = watchJob(
      first.id,
      (next) => {
        setJob(next);
        if (next.state === 'complete' || next.state === 'failed' || next.state === 'cancelled') onEnd(next);
      },
      setLost,
    );
    const clock = setInterval(() => setNow(Date.now()), 200);
    return () => {
      watch.destroy();
      clearInterval(clock);
    };
    // onEnd is a new function at every render; the job decides
    // eslint-disable-next-line react-hooks/exhaustive-deps
  }, [first.id]);

  const percent = Math.round(100 * job.progress.fraction);
  const phase = isCancelling ? 'cancelling' : job.state === 'queued' ? 'waiting for a worker' : job.progress.phase;
  const handleCancel = async () => {
    setCancelling(true);
    try {
      setJob(await cancelJob(job.id));
    } catch {
      // it ended by itself meanwhile, which the watch tells
    }
  };
  return (
    <div className="border border-line bg-linen-raised p-4" aria-live="polite">
      <div className="mb-2 flex flex-wrap items-baseline justify-between gap-x-4">
        <span>{phase}</span>
        <span className="text-ink-soft">{formatElapsed(Math.max(0, now - Date.parse(job.createdAt)))}</span>
      </div>
      <div className="flex items-center gap-3">
        <progress className="job-progress h-2 flex-1" max={100} value={percent} aria-label={`${phase}: ${percent} %`} />
        <span className="w-12 text-right">{percent} %</span>
        <button type="button" className="btn btn-small" onClick={handleCancel} disabled={isCancelling}>
          Cancel
        </button>
      </div>
      {lost && <p className="field-error mt-2">The progress cannot be read at present: {lost}</p>}
    </div>
  );
};
