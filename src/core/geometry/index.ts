/** The public list of `core/geometry`. */
export { convexHull } from './convex-hull.ts';
export type { CoordinateReference, Mesh, NodeKind } from './mesh.ts';
export { elementCount, NODE_KIND, nodeCount } from './mesh.ts';
export { meshBytes } from './mesh-bytes.ts';
export { nodePositions } from './positions.ts';
export type { ElementQuality } from './quality.ts';
export { elementQuality } from './quality.ts';
export { refine } from './refine.ts';
export { greatCircleKm, normaliseLongitude, sphericalExcess, writeLonLat, writeUnitVector } from './sphere.ts';
export type { Stereographic } from './stereographic.ts';
export { createStereographic } from './stereographic.ts';
export { createInserter, cutToLoops, triangulate } from './triangulation.ts';
export type { MeshProblem, MeshTopology } from './validate.ts';
export { meshTopology, nonDelaunayEdges, validateMesh } from './validate.ts';
