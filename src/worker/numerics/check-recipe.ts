import { createHash } from 'node:crypto';

import type { CorrelationModel } from '#core/correlation/model.ts';
import type { Recipe } from '#core/design/recipe.ts';
import { runRecipe } from '#core/design/run-recipe.ts';
import { checkMesh } from '#core/findings/check.ts';
import { packMesh } from '#core/formats/mesh-bundle.ts';
import { unpackObservations } from '#core/formats/observation-bundle.ts';
import { meshBytes } from '#core/geometry/mesh-bytes.ts';
import type { CheckFigures, Finding } from '#schemas/findings.ts';

import type { ThreadTools } from '../numerics.thread.ts';

export interface CheckCall {
  kind: 'check-recipe';
  columnsBundle: Uint8Array;
  recipe: Recipe;
  model: CorrelationModel;
}

export interface CheckAnswer {
  meshHash: string;
  nodes: number;
  elements: number;
  /** `packMesh` of mesh and observations. */
  arrays: Uint8Array;
  findings: Finding[];
  figures: CheckFigures;
  timings: Record<string, number>;
}

/** SHA-256 of a mesh's canonical bytes, lower-case hexadecimal. */
export const hashMesh = (mesh: Parameters<typeof meshBytes>[0]): string => createHash('sha256').update(meshBytes(mesh)).digest('hex');

/** Rebuilds the mesh of a recipe and judges it, phase by phase timed in milliseconds. @throws NumericalError of `runRecipe` and `checkMesh` */
export const checkRecipe = ({ columnsBundle, recipe, model }: CheckCall, tools: ThreadTools): CheckAnswer => {
  const timings: Record<string, number> = {};
  let phaseName = '';
  let since = performance.now();
  const enter = (share: number, offset: number) => (phase: string, fraction: number): void => {
    const now = performance.now();
    if (phaseName !== '') timings[phaseName] = (timings[phaseName] ?? 0) + now - since;
    phaseName = phase;
    since = now;
    tools.report(offset + share * fraction, phase);
  };
  const columns = unpackObservations(columnsBundle);
  const { selected, mesh } = runRecipe(columns, recipe, { sphereRadiusKm: model.sphereRadiusKm, onPhase: enter(0.5, 0) });
  const { findings, figures } = checkMesh({ mesh, model, rowsSelected: selected.rows.length, onPhase: enter(0.4, 0.5) });
  enter(1, 0.95)('hash', 0);
  const meshHash = hashMesh(mesh);
  const arrays = packMesh({ mesh, selected });
  enter(1, 1)('done', 0);
  return { meshHash, nodes: mesh.nodeKind.length, elements: mesh.triangles.length / 3, arrays, findings, figures, timings };
};
