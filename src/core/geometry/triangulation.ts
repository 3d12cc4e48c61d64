import Delaunator from 'delaunator';
import { incircle, orient2d } from 'robust-predicates';

import { NumericalError } from '#core/errors.ts';

/**
 * A triangulation in the plane that grows by one vertex at a time and stays Delaunay, or constrained Delaunay with
 * the boundary as constraint (Bowyer 1981; Watson 1981; predicates: Shewchuk 1997). Half-edge e belongs to triangle
 * floor(e/3) and starts at vertex `triangles[e]`; triangles are counter-clockwise with y up.
 */
export interface Triangulation {
  /** Vertices in use. */
  vertexCount: number;
  /** Triangles in use; slots are never empty. */
  triangleCount: number;
  /** 2 per vertex; longer than needed. */
  points: Float64Array;
  /** 3 vertices per triangle; longer than needed. */
  triangles: Uint32Array;
  /** Twin of each half-edge, or -1 on the boundary; longer than needed. */
  twins: Int32Array;
  /** A number carried by boundary half-edges and inherited when they are split. */
  edgeMarks: Float64Array;
}

/** Counter-clockwise when positive, exact for the given doubles. */
const turn = (p: Float64Array, a: number, b: number, x: number, y: number): number =>
  -orient2d(p[2 * a], p[2 * a + 1], p[2 * b], p[2 * b + 1], x, y);

const nextEdge = (e: number): number => (e % 3 === 2 ? e - 2 : e + 1);

/** Room for at least `count` entries, doubling so that growth costs little. */
const grown = <T extends Float64Array | Uint32Array | Int32Array>(array: T, count: number): T => {
  if (array.length >= count) return array;
  const larger = new (array.constructor as new (n: number) => T)(Math.max(count, 2 * array.length));
  larger.set(array);
  return larger;
};

/**
 * Delaunay triangulation of distinct points (2 numbers each), convex hull and all. The first triangulation is
 * delaunator's; edges that fail the exact in-circle test are flipped until none is left (Lawson 1977).
 * @throws NumericalError POINTS_COLLINEAR when no triangle can be formed.
 */
export const triangulate = (points: Float64Array): Triangulation => {
  const count = points.length / 2;
  const mirrored = new Float64Array(points.length);
  // delaunator turns clockwise with y up: exchanging x and y turns it the other way
  for (let i = 0; i < count; i++) {
    mirrored[2 * i] = points[2 * i + 1];
    mirrored[2 * i + 1] = points[2 * i];
  }
  const first = new Delaunator(mirrored);
  const triangleCount = first.triangles.length / 3;
  if (triangleCount === 0)
    throw new NumericalError('POINTS_COLLINEAR', 'All the points lie on one line, so no triangle can be formed. Add a point off that line.');
  const t: Triangulation = {
    vertexCount: count,
    triangleCount,
    points: Float64Array.from(points),
    triangles: Uint32Array.from(first.triangles),
    twins: Int32Array.from(first.halfedges),
    edgeMarks: new Float64Array(3 * triangleCount),
  };
  restoreDelaunay(t);
  return t;
};

/** Flips edges until every interior one passes the exact in-circle test; ties are left as they are. */
const restoreDelaunay = (t: Triangulation): void => {
  const { triangles, twins, points: p } = t;
  const stack: number[] = [];
  for (let e = 0; e < 3 * t.triangleCount; e++) if (twins[e] > e) stack.push(e);
  while (stack.length > 0) {
    const a = stack.pop()!;
    const b = twins[a];
    if (b < 0) continue;
    const a1 = nextEdge(a), a2 = nextEdge(a1), b1 = nextEdge(b), b2 = nextEdge(b1);
    const p0 = triangles[a], p1 = triangles[b], q = triangles[a2], r = triangles[b2];
    const inside = incircle(p[2 * p0], p[2 * p0 + 1], p[2 * p1], p[2 * p1 + 1], p[2 * q], p[2 * q + 1], p[2 * r], p[2 * r + 1]);
    if (inside <= 0) continue;
    //      q                q
    //    / a \            / | \
    //  p0 --- p1   ->   p0  |  p1
    //    \ b /            \ | /
    //      r                r
    const outerA1 = twins[a1], outerB1 = twins[b1];
    triangles[a1] = r;
    triangles[b1] = q;
    // triangle of a: p0 -> r -> q, of b: p1 -> q -> r
    link(t, a, outerB1);
    link(t, b, outerA1);
    link(t, a1, b1);
    stack.push(a, a2, b, b2);
  }
};

const link = (t: Triangulation, a: number, b: number): void => {
  t.twins[a] = b;
  if (b >= 0) t.twins[b] = a;
};

/** Half-edge from vertex a to b, or -1; `start` gives one half-edge leaving each vertex. */
const findEdge = (t: Triangulation, start: Int32Array, a: number, b: number): number => {
  const { triangles, twins } = t;
  const first = start[a];
  if (first < 0) return -1;
  let e = first;
  // counter-clockwise round a until the boundary or the start, then clockwise
  do {
    if (triangles[nextEdge(e)] === b) return e;
    const back = nextEdge(nextEdge(e));
    e = twins[back];
  } while (e >= 0 && e !== first);
  if (e >= 0) return -1;
  e = first;
  for (;;) {
    const twin = twins[e];
    if (twin < 0) return -1;
    e = nextEdge(twin);
    if (triangles[nextEdge(e)] === b) return e;
    if (e === first) return -1;
  }
};

/** One half-edge leaving each vertex, or -1. */
const leavingEdges = (t: Triangulation): Int32Array => {
  const start = new Int32Array(t.vertexCount).fill(-1);
  for (let e = 0; e < 3 * t.triangleCount; e++) start[t.triangles[e]] = e;
  return start;
};

/**
 * Keeps what lies inside the loops (outer ones counter-clockwise, holes clockwise) and makes their edges the
 * boundary, marked with `marks[loop][k]`. Returns the loop edges [loop, k] that the triangulation lacks: with any, nothing is changed.
 */
export const cutToLoops = (t: Triangulation, loops: Uint32Array[], marks: Float64Array[]): [number, number][] => {
  const start = leavingEdges(t);
  const isBoundary = new Uint8Array(3 * t.triangleCount);
  const missing: [number, number][] = [];
  const found: [number, number][] = [];
  for (const [l, loop] of loops.entries())
    for (let k = 0; k < loop.length; k++) {
      const e = findEdge(t, start, loop[k], loop[(k + 1) % loop.length]);
      if (e < 0) missing.push([l, k]);
      else {
        isBoundary[e] = 1;
        found.push([e, marks[l][k]]);
      }
    }
  if (missing.length > 0) return missing;

  const keep = new Uint8Array(t.triangleCount);
  const stack: number[] = [];
  for (const [e] of found) {
    const triangle = (e / 3) | 0;
    if (!keep[triangle]) {
      keep[triangle] = 1;
      stack.push(triangle);
    }
  }
  while (stack.length > 0) {
    const triangle = stack.pop()!;
    for (let e = 3 * triangle; e < 3 * triangle + 3; e++) {
      if (isBoundary[e] || t.twins[e] < 0) continue;
      const other = (t.twins[e] / 3) | 0;
      if (keep[other]) continue;
      keep[other] = 1;
      stack.push(other);
    }
  }
  const slot = new Int32Array(t.triangleCount).fill(-1);
  let kept = 0;
  for (let k = 0; k < t.triangleCount; k++) if (keep[k]) slot[k] = kept++;
  const moved = (e: number): number => 3 * slot[(e / 3) | 0] + (e % 3);
  const triangles = new Uint32Array(3 * kept);
  const twins = new Int32Array(3 * kept).fill(-1);
  const edgeMarks = new Float64Array(3 * kept);
  for (let e = 0; e < 3 * t.triangleCount; e++) {
    if (!keep[(e / 3) | 0]) continue;
    const at = moved(e);
    triangles[at] = t.triangles[e];
    const twin = t.twins[e];
    if (!isBoundary[e] && twin >= 0 && keep[(twin / 3) | 0]) twins[at] = moved(twin);
  }
  for (const [e, mark] of found) edgeMarks[moved(e)] = mark;
  Object.assign(t, { triangles, twins, edgeMarks, triangleCount: kept });
  return [];
};


/** Working space for `insertVertex`, reused between calls. */
export interface Inserter {
  /**
   * Inserts (x, y), looked for from triangle `from`, and returns the new vertex; its triangles are in `changed`.
   * Returns -1 with `blockingEdge` set when a boundary edge is in the way, -2 when the point meets a vertex or would
   * turn a triangle over. With `splitEdge` the point splits that boundary half-edge.
   */
  insert(x: number, y: number, from: number, splitEdge?: number): number;
  blockingEdge: number;
  /** Triangles made by the last insertion. */
  changed: number[];
}

/** Prepares insertion into `t`, whose boundary edges are never flipped away. */
export const createInserter = (t: Triangulation): Inserter => {
  let stamp = new Uint32Array(2 * t.triangleCount + 64);
  let now = 0;
  const cavity: number[] = [];
  // border half-edges of the cavity, counter-clockwise: start vertex, outer twin, mark, and whether it is the split edge
  const borderFrom: number[] = [];
  const borderTo: number[] = [];
  const borderTwin: number[] = [];
  const borderMark: number[] = [];
  const byStart = new Map<number, number>();

  const inCircle = (k: number, x: number, y: number): boolean => {
    const { triangles: v, points: p } = t;
    const a = 2 * v[3 * k], b = 2 * v[3 * k + 1], c = 2 * v[3 * k + 2];
    return incircle(p[a], p[a + 1], p[b], p[b + 1], p[c], p[c + 1], x, y) > 0;
  };

  /** Triangle that holds (x, y), or -1 with `blockingEdge` set where the walk meets the boundary. */
  const locate = (x: number, y: number, from: number): number => {
    let k = from;
    let came = -1;
    for (let step = 0; step <= 3 * t.triangleCount + 16; step++) {
      let moved = false;
      for (let j = 0; j < 3; j++) {
        const e = 3 * k + ((j + step) % 3);
        if (e === came) continue;
        if (turn(t.points, t.triangles[e], t.triangles[nextEdge(e)], x, y) >= 0) continue;
        const twin = t.twins[e];
        if (twin < 0) {
          inserter.blockingEdge = e;
          return -1;
        }
        came = twin;
        k = (twin / 3) | 0;
        moved = true;
        break;
      }
      if (!moved) return k;
    }
    throw new NumericalError('NOT_CONVERGED', 'The search for a position in the triangulation did not end. Report this observation set as a fault.');
  };

  const collect = (x: number, y: number, seed: number, splitEdge: number): boolean => {
    now++;
    cavity.length = borderFrom.length = borderTo.length = borderTwin.length = borderMark.length = 0;
    cavity.push(seed);
    stamp[seed] = now;
    const p = t.points;
    for (let head = 0; head < cavity.length; head++) {
      const k = cavity[head];
      for (let e = 3 * k; e < 3 * k + 3; e++) {
        if (e === splitEdge) continue;
        const twin = t.twins[e];
        if (twin >= 0) {
          const other = (twin / 3) | 0;
          if (stamp[other] === now) continue;
          if (inCircle(other, x, y)) {
            stamp[other] = now;
            cavity.push(other);
            continue;
          }
        }
        const a = t.triangles[e], b = t.triangles[nextEdge(e)];
        if (twin < 0 && splitEdge < 0) {
          // inside the diametral circle of a boundary edge the angle under which it is seen is obtuse
          const dot = (p[2 * a] - x) * (p[2 * b] - x) + (p[2 * a + 1] - y) * (p[2 * b + 1] - y);
          if (dot <= 0) {
            inserter.blockingEdge = e;
            return false;
          }
        }
        borderFrom.push(a);
        borderTo.push(b);
        borderTwin.push(twin);
        borderMark.push(t.edgeMarks[e]);
      }
    }
    return true;
  };

  const insert = (x: number, y: number, from: number, splitEdge = -1): number => {
    inserter.blockingEdge = -1;
    let seed = (splitEdge / 3) | 0;
    if (splitEdge < 0) {
      seed = locate(x, y, from);
      if (seed < 0) return -1;
      const { triangles: v, points: q } = t;
      for (let e = 3 * seed; e < 3 * seed + 3; e++) if (q[2 * v[e]] === x && q[2 * v[e] + 1] === y) return -2;
    }
    if (!collect(x, y, seed, splitEdge)) return -1;
    for (let k = 0; k < borderFrom.length; k++) if (!(turn(t.points, borderFrom[k], borderTo[k], x, y) > 0)) return -2;
    return fill(x, y, splitEdge);
  };

  const fill = (x: number, y: number, splitEdge: number): number => {
    const vertex = t.vertexCount++;
    t.points = grown(t.points, 2 * t.vertexCount);
    t.points[2 * vertex] = x;
    t.points[2 * vertex + 1] = y;
    const border = borderFrom.length;
    const added = border - cavity.length;
    const splitMark = splitEdge >= 0 ? t.edgeMarks[splitEdge] : 0;
    for (let k = 0; k < added; k++) cavity.push(t.triangleCount++);
    t.triangles = grown(t.triangles, 3 * t.triangleCount);
    t.twins = grown(t.twins, 3 * t.triangleCount);
    t.edgeMarks = grown(t.edgeMarks, 3 * t.triangleCount);
    if (stamp.length < t.triangleCount) {
      const larger = new Uint32Array(2 * t.triangleCount);
      larger.set(stamp);
      stamp = larger;
    }
    // border edge k becomes triangle cavity[k]: from, to, vertex
    byStart.clear();
    for (let k = 0; k < border; k++) {
      const e = 3 * cavity[k];
      t.triangles[e] = borderFrom[k];
      t.triangles[e + 1] = borderTo[k];
      t.triangles[e + 2] = vertex;
      t.edgeMarks[e] = borderMark[k];
      t.edgeMarks[e + 1] = t.edgeMarks[e + 2] = splitMark;
      t.twins[e] = borderTwin[k];
      if (borderTwin[k] >= 0) t.twins[borderTwin[k]] = e;
      t.twins[e + 1] = t.twins[e + 2] = -1;
      byStart.set(borderFrom[k], e);
    }
    for (let k = 0; k < border; k++) {
      const e = 3 * cavity[k];
      const next = byStart.get(borderTo[k]);
      if (next === undefined) continue;
      t.twins[e + 1] = next + 2;
      t.twins[next + 2] = e + 1;
    }
    inserter.changed.length = border;
    for (let k = 0; k < border; k++) inserter.changed[k] = cavity[k];
    return vertex;
  };

  const inserter: Inserter = { insert, blockingEdge: -1, changed: [] };
  return inserter;
};
