import type { Mesh } from '#core/geometry/mesh.ts';

/** How the elements of a mesh hang together; computed from the element list alone. */
export interface MeshTopology {
  nodes: number;
  elements: number;
  edges: number;
  /** Twin of half-edge 3t + k (from corner k of element t to its next), -1 on the boundary. */
  twin: Int32Array;
  /** Elements with an edge that another element runs through in the same direction. */
  overlapping: number[];
  /** Nodes that belong to no element. */
  orphans: number[];
  /** Elements that name a node that does not exist, or one node twice. */
  malformed: number[];
  /** Pieces that hang together by edges. */
  components: number;
  /** Closed boundary loops as node lists, the domain on the left. */
  loops: Uint32Array[];
  /** Nodes where the boundary touches itself. */
  pinched: number[];
}

/** Traces the topology in O(elements); malformed elements are listed and left out. */
export function meshTopology(mesh: Mesh): MeshTopology {
  const nodes = mesh.coordinates.length / 2;
  const elements = mesh.triangles.length / 3;
  const t = mesh.triangles;
  const malformed: number[] = [];
  const isMalformed = new Uint8Array(elements);
  for (let e = 0; e < elements; e++) {
    const [a, b, c] = [t[3 * e], t[3 * e + 1], t[3 * e + 2]];
    if (a >= nodes || b >= nodes || c >= nodes || a === b || b === c || c === a) {
      malformed.push(e);
      isMalformed[e] = 1;
    }
  }
  const isSound = (h: number) => isMalformed[Math.floor(h / 3)] === 0;
  const outgoing = halfEdgesByOrigin(t, nodes, isSound);
  const { twin, overlapping, edges } = matchTwins(t, outgoing, isSound);
  const orphans: number[] = [];
  for (let i = 0; i < nodes; i++) if (outgoing.start[i] === outgoing.start[i + 1]) orphans.push(i);
  const { loops, pinched } = traceLoops(t, twin, nodes, isSound);
  return { nodes, elements, edges, twin, overlapping, orphans, malformed, components: countComponents(twin, elements, isMalformed), loops, pinched };
}

/** Next half-edge within the element. */
export const nextHalfEdge = (h: number): number => (h % 3 === 2 ? h - 2 : h + 1);

interface Outgoing {
  start: Uint32Array;
  halfEdges: Uint32Array;
}

function halfEdgesByOrigin(t: Uint32Array, nodes: number, isSound: (h: number) => boolean): Outgoing {
  const start = new Uint32Array(nodes + 1);
  for (let h = 0; h < t.length; h++) if (isSound(h)) start[t[h] + 1]++;
  for (let i = 0; i < nodes; i++) start[i + 1] += start[i];
  const next = start.slice(0, nodes);
  const halfEdges = new Uint32Array(start[nodes]);
  for (let h = 0; h < t.length; h++) if (isSound(h)) halfEdges[next[t[h]]++] = h;
  return { start, halfEdges };
}

function matchTwins(t: Uint32Array, { start, halfEdges }: Outgoing, isSound: (h: number) => boolean) {
  const twin = new Int32Array(t.length).fill(-1);
  const overlapping = new Set<number>();
  let edges = 0;
  for (let h = 0; h < t.length; h++) {
    if (!isSound(h)) continue;
    const from = t[h];
    const to = t[nextHalfEdge(h)];
    for (let p = start[from]; p < start[from + 1]; p++) {
      const other = halfEdges[p];
      if (other !== h && t[nextHalfEdge(other)] === to) {
        overlapping.add(Math.floor(h / 3));
        overlapping.add(Math.floor(other / 3));
      }
    }
    for (let p = start[to]; p < start[to + 1]; p++)
      if (t[nextHalfEdge(halfEdges[p])] === from) {
        twin[h] = halfEdges[p];
        break;
      }
    if (twin[h] < 0 || twin[h] > h) edges++;
  }
  return { twin, overlapping: [...overlapping].sort((a, b) => a - b), edges };
}

function traceLoops(t: Uint32Array, twin: Int32Array, nodes: number, isSound: (h: number) => boolean) {
  const leaving = new Int32Array(nodes).fill(-1);
  const pinched = new Set<number>();
  const boundary: number[] = [];
  for (let h = 0; h < t.length; h++) {
    if (twin[h] >= 0 || !isSound(h)) continue;
    boundary.push(h);
    if (leaving[t[h]] >= 0) pinched.add(t[h]);
    leaving[t[h]] = h;
  }
  const isDone = new Uint8Array(t.length);
  const loops: Uint32Array[] = [];
  for (const first of boundary) {
    if (isDone[first]) continue;
    const loop: number[] = [];
    for (let h = first; !isDone[h]; ) {
      isDone[h] = 1;
      loop.push(t[h]);
      const end = t[nextHalfEdge(h)];
      h = pinched.has(end) ? turnAbout(twin, h) : leaving[end];
      if (h < 0) break;
    }
    loops.push(Uint32Array.from(loop));
  }
  return { loops, pinched: [...pinched].sort((a, b) => a - b) };
}

/** The boundary half-edge that leaves the end of boundary half-edge h within the same fan of elements. */
function turnAbout(twin: Int32Array, h: number): number {
  let next = nextHalfEdge(h);
  for (let guard = 0; twin[next] >= 0 && guard < twin.length; guard++) next = nextHalfEdge(twin[next]);
  return next;
}

function countComponents(twin: Int32Array, elements: number, isMalformed: Uint8Array): number {
  const isSeen = isMalformed.slice();
  const stack: number[] = [];
  let components = 0;
  for (let e = 0; e < elements; e++) {
    if (isSeen[e]) continue;
    components++;
    isSeen[e] = 1;
    stack.push(e);
    while (stack.length > 0) {
      const at = stack.pop() as number;
      for (let h = 3 * at; h < 3 * at + 3; h++) {
        const beside = twin[h] < 0 ? -1 : Math.floor(twin[h] / 3);
        if (beside < 0 || isSeen[beside]) continue;
        isSeen[beside] = 1;
        stack.push(beside);
      }
    }
  }
  return components;
}
