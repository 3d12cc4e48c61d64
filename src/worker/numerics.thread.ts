import type { MessagePort } from 'node:worker_threads';

import { NumericalError } from '#core/errors.ts';

import { checkRecipe, type CheckCall } from './numerics/check-recipe.ts';
import { makeExports, type ExportCall } from './numerics/make-exports.ts';
import { readObservations, type ReadCall } from './numerics/read-observations.ts';

/** Everything that a thread can be asked for. */
export type ThreadCall = ReadCall | CheckCall | ExportCall;

export interface ThreadError {
  code: string;
  message: string;
  details: Record<string, unknown>;
}

export interface ThreadProgress {
  fraction: number;
  phase: string;
  batch?: unknown;
  /** Nothing follows. */
  isLast?: boolean;
}

export interface ThreadTools {
  report(fraction: number, phase: string): void;
  /** Hands a batch over; resolves when the other side keeps up. */
  sendBatch(batch: unknown): Promise<void>;
}

/** Batches under way before a thread waits. */
const BATCHES_AHEAD = 4;

/** Sends batches through a port, each answered by any message when it has been dealt with. */
const createBatchSender = (port: MessagePort): ThreadTools['sendBatch'] => {
  let underWay = 0;
  let resume: (() => void) | undefined;
  port.on('message', () => {
    underWay--;
    resume?.();
  });
  port.unref();
  return async (batch) => {
    port.postMessage({ fraction: 0, phase: '', batch } satisfies ThreadProgress);
    underWay++;
    while (underWay >= BATCHES_AHEAD) await new Promise<void>((resolve) => (resume = resolve));
  };
};

const answer = (call: ThreadCall, tools: ThreadTools): unknown => {
  if (call.kind === 'read-observations') return readObservations(call, tools);
  return call.kind === 'check-recipe' ? checkRecipe(call, tools) : makeExports(call, tools);
};

/** Runs one call; what it explains comes back as an error to be thrown again, since threads lose the class of errors. */
export default async ({ call, port }: { call: ThreadCall; port: MessagePort }): Promise<{ value: unknown } | { error: ThreadError }> => {
  const tools: ThreadTools = {
    report: (fraction, phase) => port.postMessage({ fraction, phase } satisfies ThreadProgress),
    sendBatch: createBatchSender(port),
  };
  try {
    return { value: await answer(call, tools) };
  } catch (error) {
    if (error instanceof NumericalError) return { error: { code: error.code, message: error.message, details: error.details } };
    throw error;
  } finally {
    port.postMessage({ fraction: 1, phase: '', isLast: true } satisfies ThreadProgress);
    port.close();
  }
};
