import { NumericalError } from '#core/errors.ts';
import type { DesignedMesh } from '#core/design/designed-mesh.ts';
import { nodePositions } from '#core/geometry/positions.ts';

/** What the prediction needs of a mesh: its boundary. */
export type BoundaryMesh = Pick<DesignedMesh, 'crs' | 'radiusKm' | 'coordinates' | 'boundaryLoops' | 'boundaryCurvature'>;

/** Boundary edges in groups of neighbours, so that far ones are passed over a group at a time. */
export interface BoundarySegments {
  /**
   * Vertices group after group, 3 coordinates in km each: group g's edges `groupStart[g]` .. have one vertex more than
   * edges, so its first is vertex `groupStart[g] + g`. The domain lies to the left of the direction of travel.
   */
  positions: Float64Array;
  /** Signed curvature of each edge, 1/km. */
  curvature: Float64Array;
  /** First edge of each group, and the edge count at the end. */
  groupStart: Uint32Array;
  /** First group of each loop, and the group after its last. */
  loopGroups: [number, number][];
  /** Ball round each group: centre and radius, 4 per group, km. */
  groupBall: Float64Array;
}

const GROUP = 12;

export function boundarySegments(mesh: BoundaryMesh): BoundarySegments {
  const count = mesh.boundaryLoops.reduce((sum, loop) => sum + loop.length, 0);
  if (mesh.boundaryCurvature.length !== count)
    throw new NumericalError('INPUT_LENGTH_MISMATCH', `The boundary has ${count} edges but ${mesh.boundaryCurvature.length} curvatures. Give one per edge.`, { details: { edges: count, curvatures: mesh.boundaryCurvature.length } });
  const node = nodePositions(mesh);
  const starts: number[] = [];
  const vertices: number[] = [];
  let e = 0;
  const loopGroups: [number, number][] = [];
  for (const loop of mesh.boundaryLoops) {
    loopGroups.push([starts.length, starts.length + Math.ceil(loop.length / GROUP)]);
    for (let first = 0; first < loop.length; first += GROUP) {
      const edges = Math.min(GROUP, loop.length - first);
      starts.push(e);
      for (let k = 0; k <= edges; k++) vertices.push(loop[(first + k) % loop.length]);
      e += edges;
    }
  }
  const positions = new Float64Array(3 * vertices.length);
  vertices.forEach((v, k) => positions.set(node.subarray(3 * v, 3 * v + 3), 3 * k));
  const groupStart = Uint32Array.from([...starts, count]);
  return { positions, curvature: mesh.boundaryCurvature, groupStart, loopGroups, groupBall: groupBalls(positions, groupStart) };
}

function groupBalls(positions: Float64Array, groupStart: Uint32Array): Float64Array {
  const balls = new Float64Array(4 * (groupStart.length - 1));
  for (let g = 0; g + 1 < groupStart.length; g++) {
    const points = positions.subarray(3 * (groupStart[g] + g), 3 * (groupStart[g + 1] + g + 1));
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
