import type { DisplayFrame } from '#client/map/display-projection.ts';

import type { CorrelationModel } from '#core/correlation/model.ts';
import type { Recipe } from '#core/design/recipe.ts';

import type { DesignRequest, DesignResult, SpacingCells } from './compute-design.ts';

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
  /** `isNewest`: nothing else was asked for since. */
  onResult(result: DesignResult, isNewest: boolean): void;
  onFailure(failure: DesignFailure): void;
  onIdle(): void;
}

export interface DesignEngine {
  /** Hands the observation bundle over to the worker; `bytes` is not usable afterwards. */
  load(bytes: ArrayBuffer, sphereRadiusKm: number): void;
  /** Asks for a mesh; of those asked for while one is being built, only the last is built next. */
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

/**
 * Runs the design worker: it finishes the mesh in hand and goes on with the newest request. Requests are posted at once,
 * so that the worker never waits for a page that is busy drawing.
 */
export const createDesignEngine = (events: EngineEvents): DesignEngine => {
  const worker = startWorker();
  let newest = 0;

  worker.addEventListener('message', ({ data }: MessageEvent<WorkerAnswer>) => {
    switch (data.answer) {
      case 'loaded':
        return events.onLoaded(data.frame, data.rows);
      case 'phase':
        return events.onPhase(data.phase, data.fraction);
      case 'built':
        events.onResult(data.result, data.id === newest);
        break;
      case 'failed':
        events.onFailure(data);
        break;
      default:
        return;
    }
    if (data.id === newest) events.onIdle();
  });
  worker.addEventListener('error', (event) => {
    events.onFailure({ code: 'WORKER_FAILED', message: `The mesh worker stopped${event.message ? ` (${event.message})` : ''}. The recipe is kept; reload the page to go on.`, details: {} });
    events.onIdle();
  });

  return {
    load: (bytes, sphereRadiusKm) => worker.postMessage({ command: 'load', bytes, sphereRadiusKm } satisfies WorkerCommand, [bytes]),
    request: (request) => worker.postMessage({ command: 'build', id: ++newest, request } satisfies WorkerCommand),
    destroy: () => worker.terminate(),
  };
};
