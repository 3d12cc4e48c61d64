import { nodePositions } from '#core/geometry/positions.ts';
import type { BoundaryMesh } from './boundary-segments.ts';
import { boundarySegments } from './boundary-segments.ts';

/** Distance in km from each point (2 coordinates each, in the mesh's reference) to the nearest boundary edge. */
export function distanceToBoundary(mesh: BoundaryMesh, at: Float64Array): Float64Array {
  const { positions: v, groupStart, groupBall } = boundarySegments(mesh);
  const points = nodePositions({ crs: mesh.crs, radiusKm: mesh.radiusKm, coordinates: at });
  const isSphere = mesh.crs === 'lonlat-deg';
  return Float64Array.from({ length: at.length / 2 }, (_, i) => {
    const px = points[3 * i], py = points[3 * i + 1], pz = points[3 * i + 2];
    let best = Infinity;
    for (let g = 0; g + 1 < groupStart.length; g++) {
      const bx = groupBall[4 * g] - px, by = groupBall[4 * g + 1] - py, bz = groupBall[4 * g + 2] - pz;
      const far = Math.sqrt(best) + groupBall[4 * g + 3];
      if (bx * bx + by * by + bz * bz > far * far) continue;
      for (let q = 3 * (groupStart[g] + g), end = 3 * (groupStart[g + 1] + g); q < end; q += 3) {
        const ax = v[q] - px, ay = v[q + 1] - py, az = v[q + 2] - pz;
        const sx = v[q + 3] - v[q], sy = v[q + 4] - v[q + 1], sz = v[q + 5] - v[q + 2];
        const along = Math.min(1, Math.max(0, -(ax * sx + ay * sy + az * sz) / (sx * sx + sy * sy + sz * sz)));
        const x = ax + along * sx, y = ay + along * sy, z = az + along * sz;
        best = Math.min(best, x * x + y * y + z * z);
      }
    }
    const chord = Math.sqrt(best);
    return isSphere ? 2 * mesh.radiusKm * Math.asin(Math.min(1, chord / (2 * mesh.radiusKm))) : chord;
  });
}
