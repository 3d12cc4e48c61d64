import { NumericalError } from '#core/errors.ts';
import type { DesignedMesh } from '#core/design/designed-mesh.ts';
import { nodePositions } from '#core/geometry/positions.ts';

/** What the prediction needs of a mesh: its boundary. */
export type BoundaryMesh = Pick<DesignedMesh, 'crs' | 'radiusKm' | 'coordinates' | 'boundaryLoops' | 'boundaryCurvature'>;

/** Boundary edges in groups of neighbours, so that far ones are passed over a group at a time. */
export interface BoundarySegments {
  /** Start and end of each edge, 6 per edge, km. The domain lies to the left. */
  ends: Float64Array;
  /** Signed curvature of each edge, 1/km. */
  curvature: Float64Array;
  /** First edge of each group, and the edge count at the end. */
  groupStart: Uint32Array;
  /** Ball round each group: centre and radius, 4 per group, km. */
  groupBall: Float64Array;
}

const GROUP = 12;

export function boundarySegments(mesh: BoundaryMesh): BoundarySegments {
  const count = mesh.boundaryLoops.reduce((sum, loop) => sum + loop.length, 0);
  if (mesh.boundaryCurvature.length !== count)
    throw new NumericalError('INPUT_LENGTH_MISMATCH', `The boundary has ${count} edges but ${mesh.boundaryCurvature.length} curvatures. Give one per edge.`, { details: { edges: count, curvatures: mesh.boundaryCurvature.length } });
  const position = nodePositions(mesh);
  const ends = new Float64Array(6 * count);
  const starts: number[] = [];
  let e = 0;
  for (const loop of mesh.boundaryLoops)
    for (let k = 0; k < loop.length; k++, e++) {
      if (k % GROUP === 0) starts.push(e);
      const a = 3 * loop[k];
      const b = 3 * loop[(k + 1) % loop.length];
      ends.set(position.subarray(a, a + 3), 6 * e);
      ends.set(position.subarray(b, b + 3), 6 * e + 3);
    }
  const groupStart = Uint32Array.from([...starts, count]);
  return { ends, curvature: mesh.boundaryCurvature, groupStart, groupBall: groupBalls(ends, groupStart) };
}

function groupBalls(ends: Float64Array, groupStart: Uint32Array): Float64Array {
  const balls = new Float64Array(4 * (groupStart.length - 1));
  for (let g = 0; g + 1 < groupStart.length; g++) {
    const points = ends.subarray(6 * groupStart[g], 6 * groupStart[g + 1]);
    const centre = [0, 1, 2].map((axis) => {
      let low = Infinity;
      let high = -Infinity;
      for (let p = axis; p < points.length; p += 3) {
        low = Math.min(low, points[p]);
        high = Math.max(high, points[p]);
      }
      return (low + high) / 2;
    });
    let radius = 0;
    for (let p = 0; p < points.length; p += 3)
      radius = Math.max(radius, Math.hypot(points[p] - centre[0], points[p + 1] - centre[1], points[p + 2] - centre[2]));
    balls.set([...centre, radius], 4 * g);
  }
  return balls;
}
