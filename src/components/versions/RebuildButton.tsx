import { useState } from 'react';

import { sendJson } from '#client/api/fetch.ts';
import { JobProgress } from '#components/ui/JobProgress.tsx';
import { Message } from '#components/ui/Message.tsx';
import { useSubmit } from '#components/ui/use-submit.ts';
import type { Job } from '#schemas/jobs.ts';

interface RebuildResult {
  rebuiltHash: string;
  reproduced: boolean;
}

/** Makes the mesh again from the original file and the recipe, and tells whether the hash is the same. */
export const RebuildButton = ({ versionId }: { versionId: string }) => {
  const [job, setJob] = useState<Job | null>(null);
  const submit = useSubmit();
  const isRunning = job?.state === 'queued' || job?.state === 'running';
  const result = job?.state === 'complete' ? (job.result as unknown as RebuildResult) : null;
  const handleClick = () => submit.run(async () => setJob(await sendJson<Job>('POST', `/api/v1/versions/${versionId}/rebuild`)));
  return (
    <div className="grid gap-3">
      <p className="hint max-w-2xl">A fresh process gets the original file and the recipe, nothing else, and makes the mesh again. The hash tells whether it is the same to the last bit.</p>
      {isRunning && job ? (
        <JobProgress job={job} onEnd={setJob} />
      ) : (
        <button type="button" className="btn justify-self-start" onClick={handleClick} disabled={submit.isSending}>
          Rebuild and compare
        </button>
      )}
      {result?.reproduced && <Message kind="pass">Reproduced: the rebuilt mesh has the same SHA-256.</Message>}
      {result && !result.reproduced && <Message kind="fail">Not reproduced: the rebuilt mesh has the SHA-256 {result.rebuiltHash}. Do not use this version; tell your administrator.</Message>}
      {job?.state === 'failed' && <Message kind="fail">{job.error?.message}</Message>}
      {submit.failure && <Message kind="fail">{submit.failure}</Message>}
    </div>
  );
};
