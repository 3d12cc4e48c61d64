import { Delaunay } from 'd3-delaunay';

/** Voronoi cells of plane points, each clipped by the convex hull of all: together they tile the hull. */
export interface ClippedVoronoi {
  /** Area of each cell; 0 for a point that the triangulation left out because another one lies on it. */
  area: Float64Array;
  /** Centroid of each cell, 2 per point; the point itself where the cell has no area. */
  centroid: Float64Array;
  /** The nearest other point. */
  nearest: Int32Array;
  /** Corners of cell i as x, y, x, y, ...; empty where the cell has no area. */
  cell(i: number): number[];
}

/**
 * The clipped cells of at least three distinct points that are clearly not on one line, with an extent of about a
 * million (the triangulation compares with absolute tolerances). A Voronoi cell meets the hull's boundary only along
 * the hull edges that cross it, so each cell is clipped by those alone.
 */
export const clipVoronoi = (points: Float64Array): ClippedVoronoi => {
  const count = points.length / 2;
  const delaunay = new Delaunay(points);
  const voronoi = delaunay.voronoi(boundsOf(points));
  const cuts = findCuts(delaunay, points);

  const cell = (i: number): number[] => {
    const cutBy = cuts.get(i);
    if (cutBy === undefined) return circumcenterRing(delaunay, voronoi.circumcenters, i);
    let ring = (voronoi.cellPolygon(i) ?? []).slice(0, -1).flat();
    for (const [a, b] of cutBy) ring = clipByLine(ring, points, a, b);
    return ring;
  };

  const area = new Float64Array(count);
  const centroid = points.slice();
  for (let i = 0; i < count; i++) measure(cell(i), i, area, centroid);
  return { area, centroid, nearest: nearestNeighbours(delaunay, points), cell };
};

const boundsOf = (points: Float64Array): [number, number, number, number] => {
  const bounds: [number, number, number, number] = [Infinity, Infinity, -Infinity, -Infinity];
  for (let i = 0; i < points.length; i += 2) {
    bounds[0] = Math.min(bounds[0], points[i] - 1);
    bounds[1] = Math.min(bounds[1], points[i + 1] - 1);
    bounds[2] = Math.max(bounds[2], points[i] + 1);
    bounds[3] = Math.max(bounds[3], points[i + 1] + 1);
  }
  return bounds;
};

type HullEdge = [number, number];

/** For every cell that a hull edge runs through: those edges. Each edge is followed from cell to cell. */
const findCuts = (delaunay: Delaunay<unknown>, points: Float64Array): Map<number, HullEdge[]> => {
  const cuts = new Map<number, HullEdge[]>();
  const { hull } = delaunay;
  const add = (cell: number, edge: HullEdge): void => {
    const edges = cuts.get(cell);
    if (edges) edges.push(edge);
    else cuts.set(cell, [edge]);
  };
  for (let k = 0; k < hull.length; k++) {
    const edge: HullEdge = [hull[k], hull[(k + 1) % hull.length]];
    const [a, b] = edge;
    const dx = points[2 * b] - points[2 * a];
    const dy = points[2 * b + 1] - points[2 * a + 1];
    // the next cell along the edge lies farther along it, so the walk ends
    for (let cell = a; cell >= 0; ) {
      add(cell, edge);
      let next = -1;
      let first = 1;
      for (const j of delaunay.neighbors(cell)) {
        const jx = points[2 * j] - points[2 * cell];
        const jy = points[2 * j + 1] - points[2 * cell + 1];
        const along = dx * jx + dy * jy;
        if (!(along > 0)) continue;
        const mx = (points[2 * j] + points[2 * cell]) / 2 - points[2 * a];
        const my = (points[2 * j + 1] + points[2 * cell + 1]) / 2 - points[2 * a + 1];
        const t = (mx * jx + my * jy) / along;
        if (t >= first) continue;
        first = t;
        next = j;
      }
      if (next < 0 && cell !== b) add(b, edge);
      cell = next;
    }
  }
  return cuts;
};

const circumcenterRing = (delaunay: Delaunay<unknown>, circumcenters: ArrayLike<number>, i: number): number[] => {
  const { inedges, halfedges } = delaunay;
  const ring: number[] = [];
  const start = inedges[i];
  if (start < 0) return ring;
  let e = start;
  do {
    const t = Math.floor(e / 3);
    ring.push(circumcenters[2 * t], circumcenters[2 * t + 1]);
    e = halfedges[e % 3 === 2 ? e - 2 : e + 1];
  } while (e !== start && e >= 0);
  return ring;
};

/** The part of a convex ring on the hull's side of hull edge ab (Sutherland & Hodgman 1974, one line). */
const clipByLine = (ring: number[], points: Float64Array, a: number, b: number): number[] => {
  const ax = points[2 * a];
  const ay = points[2 * a + 1];
  const nx = points[2 * b + 1] - ay;
  const ny = ax - points[2 * b];
  // the order of the hull puts its inside where this is positive or zero
  const side = (x: number, y: number): number => nx * (x - ax) + ny * (y - ay);
  const out: number[] = [];
  for (let k = 0; k < ring.length; k += 2) {
    const previous = k === 0 ? ring.length - 2 : k - 2;
    const px = ring[previous];
    const py = ring[previous + 1];
    const x = ring[k];
    const y = ring[k + 1];
    const before = side(px, py);
    const here = side(x, y);
    if (before < 0 !== here < 0) {
      const t = before / (before - here);
      out.push(px + t * (x - px), py + t * (y - py));
    }
    if (here >= 0) out.push(x, y);
  }
  return out;
};

/** Area and centroid of a ring by the shoelace formula, about the point itself for accuracy. */
const measure = (ring: number[], i: number, area: Float64Array, centroid: Float64Array): void => {
  const ox = centroid[2 * i];
  const oy = centroid[2 * i + 1];
  let twice = 0;
  let mx = 0;
  let my = 0;
  for (let k = 0; k < ring.length; k += 2) {
    const next = k + 2 === ring.length ? 0 : k + 2;
    const ax = ring[k] - ox;
    const ay = ring[k + 1] - oy;
    const bx = ring[next] - ox;
    const by = ring[next + 1] - oy;
    const cross = ax * by - ay * bx;
    twice += cross;
    mx += (ax + bx) * cross;
    my += (ay + by) * cross;
  }
  area[i] = Math.abs(twice) / 2;
  if (area[i] === 0) return;
  centroid[2 * i] += mx / (3 * twice);
  centroid[2 * i + 1] += my / (3 * twice);
};

/** The nearest point is a Delaunay neighbour (of equally near ones the lowest index is taken). */
const nearestNeighbours = ({ triangles }: Delaunay<unknown>, points: Float64Array): Int32Array => {
  const nearest = new Int32Array(points.length / 2).fill(-1);
  const least = new Float64Array(points.length / 2).fill(Infinity);
  const offer = (i: number, j: number, distance2: number): void => {
    if (distance2 > least[i] || (distance2 === least[i] && j > nearest[i])) return;
    least[i] = distance2;
    nearest[i] = j;
  };
  for (let e = 0; e < triangles.length; e++) {
    const i = triangles[e];
    const j = triangles[e % 3 === 2 ? e - 2 : e + 1];
    const dx = points[2 * j] - points[2 * i];
    const dy = points[2 * j + 1] - points[2 * i + 1];
    const distance2 = dx * dx + dy * dy;
    offer(i, j, distance2);
    offer(j, i, distance2);
  }
  for (let i = 0; i < nearest.length; i++) if (nearest[i] < 0) nearest[i] = nearestByScan(points, i);
  return nearest;
};

/** For the few points that the triangulation leaves out because they all but touch another one. */
const nearestByScan = (points: Float64Array, i: number): number => {
  let nearest = -1;
  let least = Infinity;
  for (let j = 0; j < points.length / 2; j++) {
    const dx = points[2 * j] - points[2 * i];
    const dy = points[2 * j + 1] - points[2 * i + 1];
    const distance2 = dx * dx + dy * dy;
    if (j === i || distance2 >= least) continue;
    least = distance2;
    nearest = j;
  }
  return nearest;
};
