import type { DesignedMesh } from '#core/design/designed-mesh.ts';
import type { Mesh } from '#core/geometry/mesh.ts';

/**
 * A mesh to check: a designed one, or any triangulation made elsewhere, for which everything beyond `Mesh` may be
 * missing. Without `observationNode` the figures about observations are not judged; without `boundaryLoops` the
 * boundary is traced from the elements and its curvature estimated from the turning of its edges.
 */
export type CheckedMesh = Mesh & Partial<Omit<DesignedMesh, keyof Mesh>>;
