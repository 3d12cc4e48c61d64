import { setTimeout as sleep } from 'node:timers/promises';

import type { Job } from '#schemas/jobs.ts';

import type { Context } from '../context.ts';
import { getJob, isFinal } from './jobs.ts';

const EVERY_MS = 400;
const HEARTBEAT_MS = 15_000;

/** Server-sent events of a job: `job` with its JSON at once and at each change, a comment every 15 s, the end at a final state. */
export async function* jobEvents(ctx: Context, first: Job, signal: AbortSignal): AsyncGenerator<Uint8Array> {
  const encoder = new TextEncoder();
  let job = first;
  let sent = '';
  let sentAt = 0;
  while (!signal.aborted) {
    const text = JSON.stringify(job);
    if (text !== sent) {
      sent = text;
      sentAt = Date.now();
      yield encoder.encode(`event: job\ndata: ${text}\n\n`);
    } else if (Date.now() - sentAt > HEARTBEAT_MS) {
      sentAt = Date.now();
      yield encoder.encode(': alive\n\n');
    }
    if (isFinal(job.state)) return;
    try {
      await sleep(EVERY_MS, undefined, { signal });
    } catch {
      return;
    }
    job = await getJob(ctx, job.id);
  }
}
