import type { DesignedMesh } from '#core/design/designed-mesh.ts';
import { NODE_KIND } from '#core/geometry/mesh.ts';

import type { DisplayProjection } from './display-projection.ts';

/** A mesh made ready for drawing: positions in map kilometres and what joins them. */
export interface MeshBuffers {
  /** 2 per node. */
  positions: Float32Array;
  /** Elements inside the outline, and those of the buffer: 3 nodes each. */
  core: Uint32Array;
  buffer: Uint32Array;
  /** Every edge once, 2 nodes each. */
  edges: Uint32Array;
  /** Boundary edges, and edges of the outline: x1 y1 x2 y2 each. */
  boundary: Float32Array;
  outline: Float32Array;
}

type Drawable = Pick<DesignedMesh, 'coordinates' | 'triangles' | 'nodeKind' | 'boundaryLoops' | 'outline'>;

export const meshBuffers = (mesh: Drawable, projection: DisplayProjection): MeshBuffers => {
  const positions = projection.project(mesh.coordinates);
  const { core, buffer } = splitElements(mesh);
  return {
    positions,
    core,
    buffer,
    edges: uniqueEdges(mesh.triangles, positions.length / 2),
    boundary: closedLoops(mesh.boundaryLoops.map((loop) => Float32Array.from({ length: 2 * loop.length }, (_, k) => positions[2 * loop[k >> 1] + (k & 1)]))),
    outline: closedLoops(mesh.outline.map((ring) => projection.project(ring))),
  };
};

/** An element with a node of the buffer or on the outer boundary is of the buffer. */
const splitElements = ({ triangles, nodeKind }: Drawable): { core: Uint32Array; buffer: Uint32Array } => {
  const core = new Uint32Array(triangles.length);
  const buffer = new Uint32Array(triangles.length);
  let c = 0, b = 0;
  for (let t = 0; t < triangles.length; t += 3) {
    let isBuffer = false;
    for (let k = t; k < t + 3; k++) {
      const kind = nodeKind[triangles[k]];
      if (kind === NODE_KIND.buffer || kind === NODE_KIND.boundary) isBuffer = true;
    }
    for (let k = t; k < t + 3; k++)
      if (isBuffer) buffer[b++] = triangles[k];
      else core[c++] = triangles[k];
  }
  return { core: core.slice(0, c), buffer: buffer.slice(0, b) };
};

/** Edges of a triangulation, each once: an inner one is met in both directions, a boundary one in one. */
export const uniqueEdges = (triangles: Uint32Array, nodes: number): Uint32Array => {
  // the larger ends of the edges at each smaller end, as linked lists
  const first = new Int32Array(nodes).fill(-1);
  const next = new Int32Array(triangles.length);
  const other = new Uint32Array(triangles.length);
  const edges = new Uint32Array(2 * triangles.length);
  let count = 0;
  for (let e = 0; e < triangles.length; e++) {
    const a = triangles[e], b = triangles[e % 3 === 2 ? e - 2 : e + 1];
    const low = Math.min(a, b), high = Math.max(a, b);
    let k = first[low];
    while (k >= 0 && other[k] !== high) k = next[k];
    if (k >= 0) continue;
    other[count] = high;
    next[count] = first[low];
    first[low] = count;
    edges[2 * count] = low;
    edges[2 * count + 1] = high;
    count++;
  }
  return edges.slice(0, 2 * count);
};

const closedLoops = (loops: Float32Array[]): Float32Array => {
  const segments = new Float32Array(loops.reduce((sum, loop) => sum + 2 * loop.length, 0));
  let at = 0;
  for (const loop of loops)
    for (let k = 0; k < loop.length; k += 2) {
      const n = (k + 2) % loop.length;
      segments.set([loop[k], loop[k + 1], loop[n], loop[n + 1]], at);
      at += 4;
    }
  return segments;
};

/** Smallest box around points, map kilometres. */
export interface Box {
  west: number;
  south: number;
  east: number;
  north: number;
}

/** Box of 2 coordinates per point; of the origin when there are none. */
export const boxOf = (positions: ArrayLike<number>): Box => {
  if (positions.length === 0) return { west: 0, south: 0, east: 0, north: 0 };
  const box = { west: Infinity, south: Infinity, east: -Infinity, north: -Infinity };
  for (let k = 0; k < positions.length; k += 2) {
    box.west = Math.min(box.west, positions[k]);
    box.east = Math.max(box.east, positions[k]);
    box.south = Math.min(box.south, positions[k + 1]);
    box.north = Math.max(box.north, positions[k + 1]);
  }
  return box;
};
