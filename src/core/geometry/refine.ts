import { NumericalError } from '#core/errors.ts';

import { planeDistance } from './distance.ts';
import type { Triangulation } from './triangulation.ts';
import { createInserter } from './triangulation.ts';

export interface RefineOptions {
  /** Largest size at a position, km on the ground. */
  sizeAt: (x: number, y: number) => number;
  /** Plane distance per ground distance at a position; absent: 1. */
  scaleAt?: (x: number, y: number) => number;
  /** Size of each present vertex, km on the ground; extended for every vertex that is inserted. */
  vertexSize: Float64Array;
  /** Largest increase of size per distance. */
  slope: number;
  /** Vertices below this index are input: a short edge between two of them forces a small angle. */
  inputCount: number;
  /** More vertices than this raise MESH_TOO_LARGE. */
  maxVertices: number;
  isCancelled?: () => boolean;
}

/** sin² of the smallest angle that refinement aims at for triangles with an inserted vertex, 25 degrees. */
const SIN_BOUND_2 = 0.17860619515673032;
/** Distance of the off-centre from a unit edge: apex angle 25 degrees, 1 / (2 tan 12.5°), taken a little nearer. */
const OFF_CENTRE = 0.95 / (2 * 0.2216946626429399);
/** A triangle is too large when its circumradius exceeds this share of its size: 1/sqrt(3) is the equilateral one. */
const SIZE_SHARE = 0.84;
/** Edges as long as each other but for rounding are told apart by their place, so that turning all points changes nothing. */
const SHORTER = 1 - 1e-9;
/**
 * Vertices stand this share nearer to the edge at most, each by another amount: vertices at equal sizes along a straight
 * boundary would else lie on common circles, whose diagonals rounding would choose.
 */
const NUDGE = 1e-3;
const GOLDEN = 0.6180339887498949;
/** Boundary edges are split no finer than this share of the size there. */
const FINEST_SPLIT = 0.3;

/**
 * Delaunay refinement (Chew 1993; Ruppert 1995; Shewchuk 2002): first every triangle too large for its size, then
 * every triangle whose smallest angle is below 25 degrees, has an inserted vertex and no short edge between two input
 * vertices, gets a vertex on the bisector of its shortest edge, at the off-centre (Üngör 2004) or at the distance
 * where the new triangle has the wanted size, no farther than the circumcentre. A vertex that would see a boundary
 * edge under an obtuse angle splits that edge in the middle instead. Each vertex keeps at least that distance from all
 * others which makes refinement end: no new edge is shorter than the one that it mends by the 25 degree bound, and
 * boundary edges are not split below 0.3 of the size there (the triangle is then left as it is).
 * Returns the vertices' sizes. @throws NumericalError MESH_TOO_LARGE, CANCELLED.
 */
export const refine = (t: Triangulation, options: RefineOptions): Float64Array => {
  const { sizeAt, scaleAt, slope, inputCount, maxVertices, isCancelled } = options;
  let size = options.vertexSize;
  const inserter = createInserter(t);
  let queue: number[] = [];
  let queued = new Uint8Array(2 * t.triangleCount + 64);
  const push = (k: number): void => {
    if (queued.length < t.triangleCount) {
      const larger = new Uint8Array(2 * t.triangleCount);
      larger.set(queued);
      queued = larger;
    }
    if (queued[k]) return;
    queued[k] = 1;
    queue.push(k);
  };

  // figures of the triangle looked at
  let px = 0, py = 0;
  /** Sets (px, py) to the vertex that mends triangle k; false when it needs none. */
  const mend = (k: number, forQuality: boolean): boolean => {
    const v = t.triangles, p = t.points;
    const a = v[3 * k], b = v[3 * k + 1], c = v[3 * k + 2];
    const ax = p[2 * a], ay = p[2 * a + 1];
    const bx = p[2 * b] - ax, by = p[2 * b + 1] - ay;
    const cx = p[2 * c] - ax, cy = p[2 * c + 1] - ay;
    const ab = bx * bx + by * by, ac = cx * cx + cy * cy;
    const bc = (cx - bx) * (cx - bx) + (cy - by) * (cy - by);
    const twice = bx * cy - by * cx;
    if (!(twice > 0)) return false;
    const ux = (cy * ab - by * ac) / (2 * twice), uy = (bx * ac - cx * ab) / (2 * twice);
    const radius2 = ux * ux + uy * uy;
    let shortest = ab, p0 = a, p1 = b;
    let ox = 0, oy = 0, qx = bx, qy = by;
    if (bc < SHORTER * shortest) { shortest = bc; p0 = b; p1 = c; ox = bx; oy = by; qx = cx; qy = cy; }
    if (ac < SHORTER * shortest) { shortest = ac; p0 = c; p1 = a; ox = cx; oy = cy; qx = 0; qy = 0; }
    const scale = scaleAt ? scaleAt(ax + (bx + cx) / 3, ay + (by + cy) / 3) : 1;
    const h = (scale * (size[a] + size[b] + size[c])) / 3;
    const isLarge = radius2 > SIZE_SHARE * SIZE_SHARE * h * h;
    if (!isLarge) {
      if (!forQuality) return false;
      // sin of the smallest angle = shortest edge / (2 circumradius)
      if (shortest >= 4 * SIN_BOUND_2 * radius2) return false;
      if (a < inputCount && b < inputCount && c < inputCount) return false;
      if (p0 < inputCount && p1 < inputCount) return false;
    }
    const mx = (ox + qx) / 2, my = (oy + qy) / 2;
    const dx = ux - mx, dy = uy - my;
    const reach = Math.sqrt(dx * dx + dy * dy);
    const offCentre = isLarge
      ? Math.sqrt(Math.max(h * h - shortest / 4, 0.75 * shortest))
      : Math.sqrt(shortest) * OFF_CENTRE;
    const share = (offCentre < reach ? offCentre / reach : 1) * (1 - NUDGE * ((t.vertexCount * GOLDEN) % 1));
    px = ax + mx + share * dx;
    py = ay + my + share * dy;
    return true;
  };

  const addSize = (vertex: number): void => {
    if (size.length <= vertex) {
      const larger = new Float64Array(2 * vertex + 64);
      larger.set(size);
      size = larger;
    }
    const { points: p, triangles: v } = t;
    const x = p[2 * vertex], y = p[2 * vertex + 1];
    const scale = scaleAt ? scaleAt(x, y) : 1;
    let s = sizeAt(x, y);
    for (const k of inserter.changed)
      for (let e = 3 * k; e < 3 * k + 2; e++) {
        const w = v[e];
        const d = planeDistance(p[2 * w], p[2 * w + 1], x, y) / scale;
        const limit = size[w] + slope * d;
        if (limit < s) s = limit;
      }
    size[vertex] = s;
  };

  const accept = (vertex: number): void => {
    addSize(vertex);
    for (const k of inserter.changed) push(k);
    if (t.vertexCount > maxVertices)
      throw new NumericalError(
        'MESH_TOO_LARGE',
        `The mesh needs more than ${maxVertices.toLocaleString('en')} nodes. Use a larger core spacing, a faster growth or a smaller buffer.`,
        { details: { limit: maxVertices } },
      );
    if (isCancelled && t.vertexCount % 1024 === 0 && isCancelled())
      throw new NumericalError('CANCELLED', 'The mesh was not finished because it was cancelled.');
  };

  /** Splits a boundary half-edge in the middle, unless that makes it finer than the size there allows. */
  const split = (e: number): boolean => {
    const { points: p, triangles: v } = t;
    const a = v[e], b = v[e % 3 === 2 ? e - 2 : e + 1];
    const x = (p[2 * a] + p[2 * b]) / 2, y = (p[2 * a + 1] + p[2 * b + 1]) / 2;
    const length = planeDistance(p[2 * a], p[2 * a + 1], p[2 * b], p[2 * b + 1]);
    const scale = scaleAt ? scaleAt(x, y) : 1;
    if (length / 2 < (FINEST_SPLIT * scale * (size[a] + size[b])) / 2) return false;
    const vertex = inserter.insert(x, y, (e / 3) | 0, e);
    if (vertex < 0) return false;
    accept(vertex);
    return true;
  };

  for (const forQuality of [false, true]) {
    for (let k = 0; k < t.triangleCount; k++) push(k);
    for (let head = 0; head < queue.length; head++) {
      const k = queue[head];
      queued[k] = 0;
      if (head > 65_536 && head * 2 > queue.length) {
        queue = queue.slice(head + 1);
        head = -1;
      }
      if (!mend(k, forQuality)) continue;
      const vertex = inserter.insert(px, py, k);
      if (vertex >= 0) accept(vertex);
      else if (vertex === -1 && split(inserter.blockingEdge)) push(k);
    }
    queue = [];
  }
  return size.subarray(0, t.vertexCount);
};
