import { expect } from 'vitest';

import type { DesignedMesh, SelectedObservations } from '#core/design/designed-mesh.ts';
import type { ObservationColumns } from '#core/design/observations.ts';
import type { Recipe } from '#core/design/recipe.ts';
import type { CoordinateReference } from '#core/geometry/mesh.ts';
import { meshTopology } from '#core/geometry/validate.ts';

/** Numbers in [0, 1) from a seed: a linear congruential generator (Park & Miller 1988, minimal standard). */
export const seeded = (seed: number): (() => number) => {
  let state = seed % 2147483647 || 1;
  return () => (state = (state * 48271) % 2147483647) / 2147483647;
};

export const columnsOf = (crs: CoordinateReference, points: readonly (readonly [number, number])[]): ObservationColumns => ({
  crs,
  x: Float64Array.from(points, ([x]) => x),
  y: Float64Array.from(points, ([, y]) => y),
  line: Uint32Array.from(points, (_, i) => i + 2),
});

export const recipeOf = (change: Partial<Recipe> & { bufferKm: number }): Recipe => ({
  selection: { near: { km: 0, rule: 'combine' } },
  outline: { kind: 'convex' },
  corners: 'round',
  growth: 1.2,
  ...change,
});

/** What every mesh of a recipe has to be, whatever the observations. */
export const expectSound = (mesh: DesignedMesh, selected: SelectedObservations): void => {
  const { problems, boundaryLoops } = meshTopology(mesh);
  expect(problems).toEqual([]);
  expect(boundaryLoops).toHaveLength(1);
  expect(mesh.boundaryLoops).toHaveLength(1);
  expect([...mesh.boundaryLoops[0]].sort((a, b) => a - b)).toEqual([...boundaryLoops[0]].sort((a, b) => a - b));
  expect(mesh.boundaryCurvature).toHaveLength(mesh.boundaryLoops[0].length);
  expect(mesh.coordinates.every(Number.isFinite)).toBe(true);
  for (const [i, node] of mesh.observationNode.entries()) {
    expect(mesh.coordinates[2 * node]).toBe(selected.x[i]);
    expect(mesh.coordinates[2 * node + 1]).toBe(selected.y[i]);
    expect(mesh.nodeObservation[node]).toBe(i);
  }
};
