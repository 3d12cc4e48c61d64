import { incircle } from 'robust-predicates';

import type { Mesh } from './mesh.ts';
import { elementCount, nodeCount } from './mesh.ts';
import { nodePositions } from './positions.ts';
import { normaliseLongitude } from './sphere.ts';

export type MeshProblemKind =
  | 'not-finite'
  | 'out-of-range'
  | 'repeated-node'
  | 'orientation'
  | 'edge-shared'
  | 'orphan'
  | 'duplicate'
  | 'pinched'
  | 'euler';

/** One thing that makes a mesh invalid, with the nodes or elements concerned (at most 200; `count` says how many). */
export interface MeshProblem {
  kind: MeshProblemKind;
  message: string;
  nodes: number[];
  elements: number[];
  count: number;
}

/** What the topology of a mesh is, as far as it can be told. */
export interface MeshTopology {
  edges: number;
  boundaryEdges: number;
  /** Closed boundary loops of node indices, the domain on the left. */
  boundaryLoops: Uint32Array[];
  /** Parts joined by edges. */
  components: number;
  /** Nodes - edges + elements, of the nodes in use. */
  eulerCharacteristic: number;
  problems: MeshProblem[];
}

const MOST_PLACES = 200;

const problem = (kind: MeshProblemKind, message: string, where: { nodes?: number[]; elements?: number[] }): MeshProblem => ({
  kind,
  message,
  nodes: (where.nodes ?? []).slice(0, MOST_PLACES),
  elements: (where.elements ?? []).slice(0, MOST_PLACES),
  count: (where.nodes ?? where.elements ?? []).length,
});

/** Problems of a mesh, none when it is a conforming, positively oriented triangulation of a surface with boundary. */
export const validateMesh = (mesh: Mesh): MeshProblem[] => meshTopology(mesh).problems;

/**
 * Topology of a mesh and everything wrong with it: non-finite coordinates, indices out of range, elements that
 * repeat a node or are turned over or flat, edges shared by more than two elements or run twice the same way, nodes in
 * no element, nodes in one place, boundary loops that touch, and an Euler characteristic other than 2 per part less
 * one per boundary loop (a surface without handles).
 */
export const meshTopology = (mesh: Mesh): MeshTopology => {
  const nodes = nodeCount(mesh);
  const elements = elementCount(mesh);
  const nothing = { edges: 0, boundaryEdges: 0, boundaryLoops: [], components: 0, eulerCharacteristic: 0 };
  const basic = [...findBadNumbers(mesh, nodes), ...findBadElements(mesh, nodes, elements)];
  if (basic.length > 0) return { ...nothing, problems: basic };

  const problems: MeshProblem[] = [];
  const turned = findTurned(mesh, elements);
  if (turned.length > 0)
    problems.push(problem('orientation', `${turned.length} elements are flat or turned over. List their nodes counter-clockwise.`, { elements: turned }));
  const { twins, shared } = pairEdges(mesh.triangles, nodes);
  if (shared.length > 0)
    problems.push(problem('edge-shared', `${shared.length} elements share an edge that another two have, or run along it in the same direction as their neighbour. Elements must meet in pairs.`, { elements: shared }));
  const used = new Uint8Array(nodes);
  for (const i of mesh.triangles) used[i] = 1;
  const orphans = indicesWhere(nodes, (i) => used[i] === 0);
  if (orphans.length > 0) problems.push(problem('orphan', `${orphans.length} nodes belong to no element. Remove them.`, { nodes: orphans }));
  const duplicates = findDuplicates(mesh, nodes);
  if (duplicates.length > 0)
    problems.push(problem('duplicate', `${duplicates.length} nodes have the same place as another node. Merge them.`, { nodes: duplicates }));

  let boundaryEdges = 0;
  for (const twin of twins) if (twin < 0) boundaryEdges++;
  const edges = (3 * elements + boundaryEdges) / 2;
  const components = countComponents(mesh.triangles, nodes, used);
  const inUse = nodes - orphans.length;
  const eulerCharacteristic = inUse - edges + elements;
  const { loops, pinched } = traceLoops(mesh.triangles, twins);
  if (pinched.length > 0)
    problems.push(problem('pinched', `At ${pinched.length} nodes the boundary touches itself. Part the nodes or fill the gap.`, { nodes: pinched }));
  if (shared.length === 0 && pinched.length === 0 && eulerCharacteristic !== 2 * components - loops.length)
    problems.push(
      problem('euler', `The Euler characteristic is ${eulerCharacteristic}, not ${2 * components - loops.length} as ${components} parts with ${loops.length} boundary loops have.`, {}),
    );
  return { edges, boundaryEdges, boundaryLoops: loops, components, eulerCharacteristic, problems };
};

const indicesWhere = (count: number, test: (i: number) => boolean): number[] => {
  const found: number[] = [];
  for (let i = 0; i < count; i++) if (test(i)) found.push(i);
  return found;
};

const findBadNumbers = (mesh: Mesh, nodes: number): MeshProblem[] => {
  const { coordinates: c, crs } = mesh;
  const bad = indicesWhere(nodes, (i) => !Number.isFinite(c[2 * i]) || !Number.isFinite(c[2 * i + 1]));
  if (bad.length > 0) return [problem('not-finite', `${bad.length} nodes have coordinates that are not numbers.`, { nodes: bad })];
  if (crs !== 'lonlat-deg') return [];
  const outside = indicesWhere(nodes, (i) => Math.abs(c[2 * i]) > 360 || Math.abs(c[2 * i + 1]) > 90);
  if (outside.length === 0) return [];
  return [problem('out-of-range', `${outside.length} nodes have a longitude beyond 360 or a latitude beyond 90 degrees.`, { nodes: outside })];
};

const findBadElements = ({ triangles: v }: Mesh, nodes: number, elements: number): MeshProblem[] => {
  const outside = indicesWhere(elements, (t) => v[3 * t] >= nodes || v[3 * t + 1] >= nodes || v[3 * t + 2] >= nodes);
  if (outside.length > 0)
    return [problem('out-of-range', `${outside.length} elements name a node that does not exist (there are ${nodes}).`, { elements: outside })];
  const repeated = indicesWhere(elements, (t) => v[3 * t] === v[3 * t + 1] || v[3 * t + 1] === v[3 * t + 2] || v[3 * t + 2] === v[3 * t]);
  return repeated.length > 0 ? [problem('repeated-node', `${repeated.length} elements name a node twice.`, { elements: repeated })] : [];
};

const findTurned = (mesh: Mesh, elements: number): number[] => {
  const p = nodePositions(mesh);
  const v = mesh.triangles;
  return indicesWhere(elements, (t) => {
    const a = 3 * v[3 * t], b = 3 * v[3 * t + 1], c = 3 * v[3 * t + 2];
    const ux = p[b] - p[a], uy = p[b + 1] - p[a + 1], uz = p[b + 2] - p[a + 2];
    const wx = p[c] - p[a], wy = p[c + 1] - p[a + 1], wz = p[c + 2] - p[a + 2];
    const nz = ux * wy - uy * wx;
    if (mesh.crs !== 'lonlat-deg') return !(nz > 0);
    return !((uy * wz - uz * wy) * p[a] + (uz * wx - ux * wz) * p[a + 1] + nz * p[a + 2] > 0);
  });
};

/** Twin of each half-edge (3t + j runs from corner j to the next of element t), -1 without; `shared` lists elements whose edge has no single twin. */
export const pairEdges = (triangles: Uint32Array, nodes: number): { twins: Int32Array; shared: number[] } => {
  const edgeCount = triangles.length;
  const twins = new Int32Array(edgeCount).fill(-1);
  // half-edges by their lower node, in chains
  const head = new Int32Array(nodes).fill(-1);
  const next = new Int32Array(edgeCount);
  const shared = new Set<number>();
  for (let e = 0; e < edgeCount; e++) {
    const from = triangles[e], to = triangles[e % 3 === 2 ? e - 2 : e + 1];
    const low = Math.min(from, to), high = Math.max(from, to);
    for (let other = head[low]; other >= 0; other = next[other]) {
      const otherFrom = triangles[other], otherTo = triangles[other % 3 === 2 ? other - 2 : other + 1];
      if (Math.max(otherFrom, otherTo) !== high) continue;
      if (otherFrom === to && twins[other] < 0 && twins[e] < 0) {
        twins[other] = e;
        twins[e] = other;
      } else {
        shared.add((e / 3) | 0);
        shared.add((other / 3) | 0);
      }
    }
    next[e] = head[low];
    head[low] = e;
  }
  return { twins, shared: [...shared].sort((a, b) => a - b) };
};

const findDuplicates = (mesh: Mesh, nodes: number): number[] => {
  const { coordinates: c, crs } = mesh;
  const seen = new Map<string, number>();
  return indicesWhere(nodes, (i) => {
    const lon = crs === 'lonlat-deg' ? (Math.abs(c[2 * i + 1]) === 90 ? 0 : normaliseLongitude(c[2 * i])) : c[2 * i];
    const key = `${lon + 0} ${c[2 * i + 1] + 0}`;
    if (seen.has(key)) return true;
    seen.set(key, i);
    return false;
  });
};

const countComponents = (triangles: Uint32Array, nodes: number, used: Uint8Array): number => {
  const parent = Int32Array.from({ length: nodes }, (_, i) => i);
  const root = (i: number): number => {
    while (parent[i] !== i) i = parent[i] = parent[parent[i]];
    return i;
  };
  for (let t = 0; t < triangles.length; t += 3) {
    const a = root(triangles[t]);
    parent[root(triangles[t + 1])] = a;
    parent[root(triangles[t + 2])] = a;
  }
  return indicesWhere(nodes, (i) => used[i] === 1 && root(i) === i).length;
};

const traceLoops = (triangles: Uint32Array, twins: Int32Array): { loops: Uint32Array[]; pinched: number[] } => {
  const target = new Map<number, number>();
  const pinched: number[] = [];
  for (let e = 0; e < triangles.length; e++) {
    if (twins[e] >= 0) continue;
    if (target.has(triangles[e])) pinched.push(triangles[e]);
    else target.set(triangles[e], triangles[e % 3 === 2 ? e - 2 : e + 1]);
  }
  const loops: Uint32Array[] = [];
  for (const first of [...target.keys()].sort((a, b) => a - b)) {
    const loop: number[] = [];
    for (let node = first; target.has(node); ) {
      const to = target.get(node)!;
      target.delete(node);
      loop.push(node);
      node = to;
    }
    if (loop.length > 0) loops.push(Uint32Array.from(loop));
  }
  return { loops, pinched };
};

/**
 * Inner edges that are not locally Delaunay in the given plane coordinates (2 per node), as pairs of nodes, by the
 * exact in-circle test: the far node of either triangle lies strictly inside the other's circumcircle.
 */
export const nonDelaunayEdges = (triangles: Uint32Array, plane: Float64Array): [number, number][] => {
  const { twins } = pairEdges(triangles, plane.length / 2);
  const found: [number, number][] = [];
  const at = (i: number): [number, number] => [plane[2 * i], plane[2 * i + 1]];
  for (let e = 0; e < triangles.length; e++) {
    const twin = twins[e];
    if (twin < e) continue;
    const t = 3 * ((e / 3) | 0);
    const far = triangles[3 * ((twin / 3) | 0) + ((twin % 3) + 2) % 3];
    const a = at(triangles[t]), b = at(triangles[t + 1]), c = at(triangles[t + 2]), d = at(far);
    if (incircle(a[0], a[1], b[0], b[1], c[0], c[1], d[0], d[1]) > 0) found.push([triangles[e], triangles[e % 3 === 2 ? e - 2 : e + 1]]);
  }
  return found;
};
