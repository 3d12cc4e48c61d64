import type { DisplayFrame } from '#client/map/display-projection.ts';

import type { DesignRequest, DesignResult } from './compute-design.ts';
import { createLatestQueue } from './latest-queue.ts';

export type WorkerCommand =
  | { command: 'load'; bytes: ArrayBuffer; sphereRadiusKm: number }
  | { command: 'build'; id: number; request: DesignRequest };

export type WorkerAnswer =
  | { answer: 'loaded'; frame: DisplayFrame; rows: number }
  | { answer: 'phase'; phase: string; fraction: number }
  | { answer: 'built'; id: number; result: DesignResult }
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

/** Runs the design worker: one mesh at a time, the newest request next. */
export const createDesignEngine = (events: EngineEvents): DesignEngine => {
  const worker = new Worker(new URL('../design-worker.ts', import.meta.url), { type: 'module', name: 'design' });
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
