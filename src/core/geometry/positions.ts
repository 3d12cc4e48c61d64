import type { Mesh } from './mesh.ts';
import { writeUnitVector } from './sphere.ts';

/** Positions of the nodes in km, 3 per node: on the sphere of the mesh's radius, or in the plane z = 0. */
export const nodePositions = (mesh: Pick<Mesh, 'crs' | 'radiusKm' | 'coordinates'>): Float64Array => {
  const count = mesh.coordinates.length / 2;
  const positions = new Float64Array(3 * count);
  for (let i = 0; i < count; i++) {
    if (mesh.crs === 'lonlat-deg') {
      writeUnitVector(mesh.coordinates[2 * i], mesh.coordinates[2 * i + 1], positions, 3 * i);
      for (let k = 3 * i; k < 3 * i + 3; k++) positions[k] *= mesh.radiusKm;
    } else {
      positions[3 * i] = mesh.coordinates[2 * i];
      positions[3 * i + 1] = mesh.coordinates[2 * i + 1];
    }
  }
  return positions;
};

/** Distance on the ground in km between two nodes' coordinates is `greatCircleKm` on the sphere; this is the straight edge. */
export const edgeLengthKm = (positions: Float64Array, a: number, b: number): number => {
  const dx = positions[3 * a] - positions[3 * b];
  const dy = positions[3 * a + 1] - positions[3 * b + 1];
  const dz = positions[3 * a + 2] - positions[3 * b + 2];
  return Math.sqrt(dx * dx + dy * dy + dz * dz);
};
