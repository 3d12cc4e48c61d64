import type { DisplayFrame } from '#client/map/display-projection.ts';

import type { CorrelationModel } from '#core/correlation/model.ts';
import type { Recipe } from '#core/design/recipe.ts';

import type { DesignRequest, DesignResult, SpacingCells } from './compute-design.ts';
import { createLatestQueue } from './latest-queue.ts';

export type WorkerCommand =
  | { command: 'load'; bytes: ArrayBuffer; sphereRadiusKm: number }
  | { command: 'build'; id: number; request: DesignRequest }
  /** A stored mesh, described as if it had just been built. */
  | { command: 'open'; bytes: ArrayBuffer; recipe: Recipe; model: CorrelationModel }
  /** Local spacing of all rows of an observation set. */
  | { command: 'spacing'; bytes: ArrayBuffer; frame: DisplayFrame };

export type WorkerAnswer =
  | { answer: 'loaded'; frame: DisplayFrame; rows: number }
  | { answer: 'phase'; phase: string; fraction: number }
  | { answer: 'built'; id: number; result: DesignResult }
  | { answer: 'opened'; frame: DisplayFrame; result: DesignResult }
  | { answer: 'spaced'; spacingKm: Float64Array; cells: SpacingCells | null }
  | { answer: 'failed'; id: number; code: string; message: string; details: Record<string, unknown> };

/** Why there is no mesh; `message` is for the person. */
export interface DesignFailure {
  code: string;
  message: string;
  details: Record<string, unknown>;
}

export interface EngineEvents {
  onLoaded(frame: DisplayFrame, rows: number): void;
  onPhase(phase: string, fraction: number): void;
  onResult(result: DesignResult): void;
  onFailure(failure: DesignFailure): void;
  onIdle(): void;
}

export interface DesignEngine {
  /** Hands the observation bundle over to the worker; `bytes` is not usable afterwards. */
  load(bytes: ArrayBuffer, sphereRadiusKm: number): void;
  /** Asks for a mesh; of several asked for while one is being built, only the last is built. */
  request(request: DesignRequest): void;
  destroy(): void;
}

const startWorker = (): Worker => new Worker(new URL('../design-worker.ts', import.meta.url), { type: 'module', name: 'design' });

/** Sends one command to a worker of its own and resolves with the answer of that kind; rejects with the failure's message. */
export const askWorker = <K extends WorkerAnswer['answer']>(command: WorkerCommand, kind: K, transfer: ArrayBuffer[] = []): Promise<Extract<WorkerAnswer, { answer: K }>> =>
  new Promise((resolve, reject) => {
    const worker = startWorker();
    worker.addEventListener('message', ({ data }: MessageEvent<WorkerAnswer>) => {
      if (data.answer !== kind && data.answer !== 'failed') return;
      worker.terminate();
      if (data.answer === kind) resolve(data as Extract<WorkerAnswer, { answer: K }>);
      else if (data.answer === 'failed') reject(new Error(data.message));
    });
    worker.addEventListener('error', (event) => {
      worker.terminate();
      reject(new Error(`The worker stopped${event.message ? ` (${event.message})` : ''}.`));
    });
    worker.postMessage(command, transfer);
  });

/** Runs the design worker: one mesh at a time, the newest request next. */
export const createDesignEngine = (events: EngineEvents): DesignEngine => {
  const worker = startWorker();
  let finish: (() => void) | null = null;
  let id = 0;

  const done = (): void => {
    finish?.();
    finish = null;
  };
  const queue = createLatestQueue<DesignRequest>(
    (request) =>
      new Promise<void>((resolve) => {
        finish = resolve;
        worker.postMessage({ command: 'build', id: ++id, request } satisfies WorkerCommand);
      }),
    () => events.onIdle(),
  );

  worker.addEventListener('message', ({ data }: MessageEvent<WorkerAnswer>) => {
    switch (data.answer) {
      case 'loaded':
        return events.onLoaded(data.frame, data.rows);
      case 'phase':
        return events.onPhase(data.phase, data.fraction);
      case 'built':
        events.onResult(data.result);
        return done();
      case 'failed':
        events.onFailure(data);
        return done();
    }
  });
  worker.addEventListener('error', (event) => {
    events.onFailure({ code: 'WORKER_FAILED', message: `The mesh worker stopped${event.message ? ` (${event.message})` : ''}. The recipe is kept; reload the page to go on.`, details: {} });
    done();
  });

  return {
    load: (bytes, sphereRadiusKm) => worker.postMessage({ command: 'load', bytes, sphereRadiusKm } satisfies WorkerCommand, [bytes]),
    request: (request) => queue.push(request),
    destroy() {
      queue.clear();
      worker.terminate();
    },
  };
};
