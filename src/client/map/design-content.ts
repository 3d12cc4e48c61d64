import type { DesignResult } from '#client/design/compute-design.ts';
import { formatKm, formatPercent, formatPosition } from '#client/design/words.ts';
import type { CorrelationModel } from '#core/correlation/model.ts';
import { NODE_KIND } from '#core/geometry/mesh.ts';

import type { DisplayFrame } from './display-projection.ts';
import { createDisplayProjection } from './display-projection.ts';
import type { MapContent } from './map-controller.ts';
import type { CellBuffers, LayerChoice, PointBuffers } from './map-scene.ts';
import { spacingCellBuffers } from './observation-content.ts';

const KIND_WORDS: Record<number, string> = {
  [NODE_KIND.observation]: 'observation',
  [NODE_KIND.core]: 'filler node of the core',
  [NODE_KIND.buffer]: 'node of the buffer',
  [NODE_KIND.boundary]: 'node of the boundary',
  [NODE_KIND.hole]: 'node of a hole',
};

/** The parts of a result that are uploaded, made once per result and setting. */
const pointsCache = new WeakMap<DesignResult, Map<string, PointBuffers>>();
const cellsCache = new WeakMap<NonNullable<DesignResult['cells']>, CellBuffers>();

/** What the map shows of a result. */
export const designContent = (frame: DisplayFrame, result: DesignResult, model: CorrelationModel, layers: LayerChoice): MapContent => {
  const { mesh, buffers, effect, figures } = result;
  const force = model.normalisation === 'exact' ? 'correlation' : 'variance';
  // one scale at a time
  const isColoured = layers.effect && !layers.spacing;
  return {
    frame,
    mesh: buffers,
    triangles: mesh.triangles,
    points: pointsOf(frame, result, isColoured ? effect[force] : null, `${isColoured ? force : 'plain'} ${model.tolerance}`, model.tolerance),
    cells: layers.spacing && result.cells ? cellsOf(result.cells, mesh.localSpacingKm) : null,
    limiting: figures[force].observation,
    pickable: buffers.positions,
    describe(node) {
      const observation = mesh.nodeObservation[node];
      const position = formatPosition(mesh.coordinates[2 * node], mesh.coordinates[2 * node + 1], mesh.crs);
      if (observation < 0) return { title: `node ${node}`, lines: [KIND_WORDS[mesh.nodeKind[node]], position] };
      const rows = result.selected.rowStart[observation + 1] - result.selected.rowStart[observation];
      return {
        title: `observation ${observation}`,
        lines: [
          position,
          `local spacing ${formatKm(mesh.localSpacingKm[observation])}`,
          `variance change ${formatPercent(effect.variance[observation])}`,
          `correlation change ${formatPercent(effect.correlation[observation])}`,
          ...(rows > 1 ? [`combined from ${rows} rows`] : []),
        ],
      };
    },
    observationIndex: (observation) => mesh.observationNode[observation] ?? -1,
    bufferKm: result.recipe.bufferKm,
  };
};

const pointsOf = (frame: DisplayFrame, result: DesignResult, values: Float64Array | null, key: string, limit: number): PointBuffers => {
  const known = pointsCache.get(result) ?? new Map<string, PointBuffers>();
  pointsCache.set(result, known);
  const made = known.get(key);
  if (made) return made;
  const { x, y } = result.selected;
  const coordinates = new Float64Array(2 * x.length);
  for (let i = 0; i < x.length; i++) {
    coordinates[2 * i] = x[i];
    coordinates[2 * i + 1] = y[i];
  }
  const points = { positions: createDisplayProjection(frame).project(coordinates), share: values ? Float32Array.from(values, (value) => Math.max(0, value / limit)) : null };
  known.set(key, points);
  return points;
};

const cellsOf = (cells: NonNullable<DesignResult['cells']>, spacingKm: Float64Array): CellBuffers => {
  const made = cellsCache.get(cells);
  if (made) return made;
  const buffers = spacingCellBuffers(cells, spacingKm);
  cellsCache.set(cells, buffers);
  return buffers;
};
