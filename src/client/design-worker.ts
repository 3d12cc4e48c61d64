import { NumericalError } from '#core/errors.ts';
import { createRecipeRunner } from '#core/design/run-recipe.ts';
import { localSpacing } from '#core/design/local-spacing.ts';
import { unpackMesh } from '#core/formats/mesh-bundle.ts';
import { unpackObservations } from '#core/formats/observation-bundle.ts';
import { createDisplayProjection, frameOf } from '#client/map/display-projection.ts';

import type { ComputeOptions, DesignRequest } from './design/compute-design.ts';
import { computeDesign, describeMesh, transferables } from './design/compute-design.ts';
import { createLatestTask } from './design/latest-task.ts';
import type { WorkerAnswer, WorkerCommand } from './design/design-engine.ts';

let options: ComputeOptions | null = null;
let rehearsals = 5;
/** A build was asked for since the first one. */
let isWanted = false;

const answer = (message: WorkerAnswer, transfer: ArrayBuffer[] = []): void => self.postMessage(message, { transfer });

const build = createLatestTask<Extract<WorkerCommand, { command: 'build' }>>(
  ({ id, request }) =>
    attempt(id, () => {
      const result = computeDesign(request, options!);
      answer({ answer: 'built', id, result }, [...transferables(result)]);
      rehearse(request);
    }),
  (task) => setTimeout(task, 0),
);

/** Code is fast only once the engine has compiled it: a few runs that nobody waits for make the first drag a smooth one. */
const rehearse = (request: DesignRequest): void => {
  if (rehearsals === 0) return;
  rehearsals--;
  setTimeout(() => {
    if (isWanted) return;
    computeDesign(request, { ...options!, onPhase: () => {} });
    rehearse(request);
  }, 60);
};

const attempt = (id: number, work: () => void): void => {
  try {
    work();
  } catch (error) {
    const known = error instanceof NumericalError;
    answer({
      answer: 'failed',
      id,
      code: known ? error.code : 'UNEXPECTED',
      message: known ? error.message : `The mesh could not be built (${String(error)}). The recipe is kept; change it or reload the page.`,
      details: known ? error.details : {},
    });
  }
};

self.addEventListener('message', ({ data }: MessageEvent<WorkerCommand>) => {
  if (data.command === 'build') {
    isWanted = data.id > 1;
    return build(data);
  }
  attempt(0, () => {
    switch (data.command) {
      case 'load': {
        const columns = unpackObservations(new Uint8Array(data.bytes));
        const frame = frameOf(columns.crs, columns.x, columns.y, data.sphereRadiusKm);
        options = {
          runner: createRecipeRunner(columns),
          projection: createDisplayProjection(frame),
          rows: columns.x.length,
          onPhase: (phase, fraction) => answer({ answer: 'phase', phase, fraction }),
          now: () => performance.now(),
        };
        return answer({ answer: 'loaded', frame, rows: columns.x.length });
      }
      case 'open': {
        const { mesh, selected } = unpackMesh(new Uint8Array(data.bytes));
        const frame = frameOf(mesh.crs, selected.x, selected.y, data.model.sphereRadiusKm);
        const result = describeMesh(mesh, selected, data.recipe, data.model, createDisplayProjection(frame), selected.exclusion.length);
        return answer({ answer: 'opened', frame, result }, [...transferables(result)]);
      }
      case 'spacing': {
        const columns = unpackObservations(new Uint8Array(data.bytes));
        const { spacingKm, cells } = localSpacing(columns, data.frame.radiusKm, { withCells: true });
        const drawn = cells ? { start: cells.start, positions: createDisplayProjection(data.frame).project(cells.coordinates) } : null;
        return answer({ answer: 'spaced', spacingKm, cells: drawn });
      }
    }
  });
});
