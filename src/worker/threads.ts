import { availableParallelism } from 'node:os';
import { fileURLToPath } from 'node:url';
import { MessageChannel } from 'node:worker_threads';

import { Piscina } from 'piscina';

import { NumericalError } from '#core/errors.ts';
import type { NumericalErrorCode } from '#core/errors.ts';
import { getEnv } from '#server/env.ts';

import type { ThreadCall, ThreadError, ThreadProgress } from './numerics.thread.ts';

let pool: Piscina | undefined;

const getPool = (): Piscina => {
  if (!pool) {
    const extension = import.meta.url.endsWith('.ts') ? 'ts' : 'js';
    pool = new Piscina({
      filename: fileURLToPath(new URL(`./numerics.thread.${extension}`, import.meta.url)),
      maxThreads: getEnv().workerThreads || availableParallelism(),
      minThreads: 1,
      idleTimeout: 60_000,
    });
  }
  return pool;
};

export interface ThreadOptions {
  /** Ends the thread at once when aborted. */
  signal?: AbortSignal;
  onProgress?: (fraction: number, phase: string) => void;
  /** Batches that the call hands over before it ends, one at a time; what this throws ends the call. */
  onBatch?: (batch: unknown) => Promise<void>;
}

/** Runs one call of `numerics.thread.ts` in a thread of its own. @throws NumericalError as the call threw it; the signal's reason when aborted */
export const runInThread = async <T>(call: ThreadCall, { signal, onProgress, onBatch }: ThreadOptions = {}): Promise<T> => {
  const { port1, port2 } = new MessageChannel();
  let end: () => void = () => undefined;
  // the last message comes after every batch, which the call's answer need not
  const ended = new Promise<void>((resolve) => (end = resolve));
  const failed = new AbortController();
  const stop = signal ? AbortSignal.any([signal, failed.signal]) : failed.signal;
  let handling: Promise<void> = Promise.resolve();
  port1.on('message', (message: ThreadProgress) => {
    if (message.isLast) end();
    else if (message.batch === undefined) onProgress?.(message.fraction, message.phase);
    else
      handling = handling
        .then(() => (stop.aborted ? undefined : onBatch?.(message.batch)))
        .then(() => port1.postMessage(null))
        .catch((error: unknown) => failed.abort(error));
  });
  try {
    const answer = (await getPool().run({ call, port: port2 }, { transferList: [port2], signal: stop })) as { value: T } | { error: ThreadError };
    await ended;
    await handling;
    stop.throwIfAborted();
    if ('error' in answer) throw new NumericalError(answer.error.code as NumericalErrorCode, answer.error.message, { details: answer.error.details });
    return answer.value;
  } catch (error) {
    if (stop.aborted) throw stop.reason;
    throw error;
  } finally {
    port1.close();
  }
};

/** Ends all threads. */
export const closeThreads = async (): Promise<void> => {
  await pool?.destroy();
  pool = undefined;
};
