import { predictBoundaryEffect } from '#core/correlation/boundary-effect.ts';
import type { CorrelationModel } from '#core/correlation/model.ts';
import type { DesignedMesh, SelectedObservations } from '#core/design/designed-mesh.ts';
import { localSpacing } from '#core/design/local-spacing.ts';
import type { Recipe } from '#core/design/recipe.ts';
import type { createRecipeRunner } from '#core/design/run-recipe.ts';
import { resolveScale } from '#core/correlation/scale.ts';
import { coreSpacing } from '#core/findings/resolution-findings.ts';
import { nodePositions } from '#core/geometry/positions.ts';
import { elementQuality } from '#core/geometry/quality.ts';
import type { DisplayProjection } from '#client/map/display-projection.ts';
import type { MeshBuffers } from '#client/map/mesh-buffers.ts';
import { meshBuffers } from '#client/map/mesh-buffers.ts';

export interface DesignRequest {
  recipe: Recipe;
  model: CorrelationModel;
  /** With the clipped Voronoi cells, where the last result had others. */
  withCells: boolean;
}

/** Largest and where: `observation` is an index of the selected observations. */
export interface Worst {
  value: number;
  observation: number;
}

export interface DesignFigures {
  nodes: number;
  elements: number;
  observations: number;
  rowsSelected: number;
  rows: number;
  /** Local edge length in the core over D (over l with 2 steps), as the check measures it; null without core edges. */
  coarseness: { p95: number; largest: number; node: number } | null;
  /** Degrees, and the element that has it. */
  smallestAngle: { value: number; element: number };
  variance: Worst;
  correlation: Worst;
  /** Non-zeros of A = M + l²K: nodes plus twice the edges. */
  nonZeros: number;
  /** Sharpest change of direction of the outline, radians. */
  worstTurning: number;
}

/** Clipped Voronoi cells for drawing: cell i has corners start[i] .. start[i + 1] - 1 of `positions`, 2 per corner. */
export interface SpacingCells {
  start: Uint32Array;
  positions: Float32Array;
}

/** A mesh with all that the designer shows of it. Transferable. */
export interface DesignResult {
  recipe: Recipe;
  mesh: DesignedMesh;
  selected: Pick<SelectedObservations, 'x' | 'y' | 'rowStart' | 'rows'>;
  buffers: MeshBuffers;
  /** Predicted boundary effect per selected observation. */
  effect: { variance: Float64Array; correlation: Float64Array };
  cells: SpacingCells | null;
  figures: DesignFigures;
  milliseconds: number;
}

export interface ComputeOptions {
  runner: ReturnType<typeof createRecipeRunner>;
  projection: DisplayProjection;
  rows: number;
  onPhase: (phase: string, fraction: number) => void;
  now: () => number;
}

/** Builds the mesh of a recipe and everything drawn or read out from it. Throws what `runRecipe` throws. */
export const computeDesign = (request: DesignRequest, { runner, projection, rows, onPhase, now }: ComputeOptions): DesignResult => {
  const started = now();
  const { recipe, model } = request;
  const { selected, mesh } = runner(recipe, { sphereRadiusKm: model.sphereRadiusKm, onPhase });
  onPhase('boundary effect', 0.92);
  // the runner keeps its own arrays for the next run
  const own = { ...mesh, localSpacingKm: mesh.localSpacingKm.slice(), outline: mesh.outline.map((ring) => ring.slice()) };
  const shown = describeMesh(own, selected, recipe, model, projection, rows);
  const cells = request.withCells ? spacingCells(selected, model.sphereRadiusKm, projection) : null;
  return { ...shown, cells, milliseconds: now() - started };
};

/** Everything drawn or read out from a mesh; `rows` of its observation set, selected or not. */
export const describeMesh = (
  mesh: DesignedMesh,
  selected: SelectedObservations,
  recipe: Recipe,
  model: CorrelationModel,
  projection: DisplayProjection,
  rows: number,
): DesignResult => {
  const at = new Float64Array(2 * selected.x.length);
  for (let i = 0; i < selected.x.length; i++) {
    at[2 * i] = selected.x[i];
    at[2 * i + 1] = selected.y[i];
  }
  const effect = predictBoundaryEffect(mesh, at, model);
  const buffers = meshBuffers(mesh, projection);
  return {
    recipe,
    mesh,
    selected: { x: selected.x.slice(), y: selected.y.slice(), rowStart: selected.rowStart.slice(), rows: selected.rows.slice() },
    buffers,
    effect,
    cells: null,
    figures: { ...meshFigures(mesh, model, buffers), rowsSelected: selected.rows.length, rows, variance: largest(effect.variance), correlation: largest(effect.correlation) },
    milliseconds: 0,
  };
};

/** Cells of points, or null for points on one line. */
export const spacingCells = (selected: Pick<SelectedObservations, 'crs' | 'x' | 'y'>, radiusKm: number, projection: DisplayProjection): SpacingCells | null => {
  const { cells } = localSpacing(selected, radiusKm, { withCells: true });
  return cells ? { start: cells.start, positions: projection.project(cells.coordinates) } : null;
};

const largest = (values: Float64Array): Worst => {
  let observation = 0;
  for (let i = 1; i < values.length; i++) if (values[i] > values[observation]) observation = i;
  return { value: values[observation] ?? 0, observation };
};

const meshFigures = (mesh: DesignedMesh, model: CorrelationModel, buffers: MeshBuffers): Omit<DesignFigures, 'rowsSelected' | 'rows' | 'variance' | 'correlation'> => {
  const positions = nodePositions(mesh);
  const { smallestAngle } = elementQuality(mesh, positions);
  let element = 0;
  for (let t = 1; t < smallestAngle.length; t++) if (smallestAngle[t] < smallestAngle[element]) element = t;
  const nodes = mesh.coordinates.length / 2;
  return {
    nodes,
    elements: mesh.triangles.length / 3,
    observations: mesh.observationNode.length,
    coarseness: coarseness(mesh, model, positions),
    smallestAngle: { value: smallestAngle[element], element },
    nonZeros: nodes + buffers.edges.length,
    worstTurning: mesh.outlineCorners.reduce((most, corner) => Math.max(most, corner.turning), 0),
  };
};

const coarseness = (mesh: DesignedMesh, model: CorrelationModel, positions: Float64Array): DesignFigures['coarseness'] => {
  const { nodes, meanEdgeKm } = coreSpacing(mesh, positions);
  if (nodes.length === 0) return null;
  const { scaleKm, daleyKm } = resolveScale(model);
  const lengthKm = daleyKm ?? scaleKm;
  let longest = 0;
  for (let k = 1; k < nodes.length; k++) if (meanEdgeKm[k] > meanEdgeKm[longest]) longest = k;
  const sorted = meanEdgeKm.slice().sort();
  return { p95: sorted[Math.floor(0.95 * (sorted.length - 1))] / lengthKm, largest: meanEdgeKm[longest] / lengthKm, node: nodes[longest] };
};

/** The buffers behind every typed array of a result, each once, to be handed over instead of copied. */
export const transferables = (value: unknown, found = new Set<ArrayBuffer>()): Set<ArrayBuffer> => {
  if (ArrayBuffer.isView(value)) found.add(value.buffer as ArrayBuffer);
  else if (typeof value === 'object' && value !== null) for (const part of Object.values(value)) transferables(part, found);
  return found;
};
