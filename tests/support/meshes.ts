import { expect } from 'vitest';

import type { DesignedMesh, SelectedObservations } from '#core/design/designed-mesh.ts';
import { meshTopology } from '#core/geometry/validate.ts';

export { columnsOf, recipeOf, seeded } from './point-sets.ts';

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
