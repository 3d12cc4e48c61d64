import { Delaunay } from 'd3-delaunay';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';

import type { NumericalError } from '#core/errors.ts';
import { elementQuality } from '#core/geometry/quality.ts';
import { refine } from '#core/geometry/refine.ts';
import type { Triangulation } from '#core/geometry/triangulation.ts';
import { createInserter, cutToLoops, triangulate } from '#core/geometry/triangulation.ts';
import { meshTopology, nonDelaunayEdges } from '#core/geometry/validate.ts';
import { bell, lattice, ring, scattered } from '#support/point-sets.ts';

const flat = (places: (readonly [number, number])[]): Float64Array => Float64Array.from(places.flat());
const meshOf = (t: Triangulation) => ({
  crs: 'plane-km' as const,
  radiusKm: 0,
  coordinates: t.points.slice(0, 2 * t.vertexCount),
  triangles: t.triangles.slice(0, 3 * t.triangleCount),
});
const areaOf = (t: Triangulation): number => elementQuality(meshOf(t)).areaKm2.reduce((sum, a) => sum + a, 0);

/** Twins agree, triangles are counter-clockwise and conforming, and every inner edge passes the exact in-circle test. */
const expectDelaunay = (t: Triangulation): void => {
  const mesh = meshOf(t);
  expect(meshTopology(mesh).problems.filter(({ kind }) => kind !== 'orphan')).toEqual([]);
  expect(nonDelaunayEdges(mesh.triangles, mesh.coordinates)).toEqual([]);
  for (let e = 0; e < 3 * t.triangleCount; e++) {
    const twin = t.twins[e];
    if (twin < 0) continue;
    expect(t.twins[twin]).toBe(e);
    expect(t.triangles[twin]).toBe(t.triangles[e % 3 === 2 ? e - 2 : e + 1]);
  }
};

describe('triangulation of points', () => {
  it.each([
    ['even', scattered(2000, 1, [0, 0, 1, 1])],
    ['in a bell', bell(2000, 2, 1)],
    ['an exact grid', lattice(400, 1)],
    ['on a circle', ring(200, 1)],
    ['tiny', scattered(300, 3, [0, 0, 1e-9, 1e-9])],
    ['huge', scattered(300, 3, [0, 0, 1e9, 1e9])],
    ['far from the origin', scattered(300, 4, [1e6, 1e6, 1e6 + 1, 1e6 + 1])],
  ])('is Delaunay and covers the hull: %s', (...[, places]) => {
    const t = triangulate(flat(places));
    expectDelaunay(t);
    const hull = Delaunay.from(places).hullPolygon();
    const [ox, oy] = hull[0];
    const hullArea = hull.slice(1).reduce((sum, [x, y], k) => sum + ((hull[k][0] - ox) * (y - oy) - (x - ox) * (hull[k][1] - oy)) / 2, 0);
    expect(areaOf(t) / Math.abs(hullArea)).toBeCloseTo(1, 9);
  });

  it('passes the exact test where a plain floating-point in-circle test cannot', () => {
    // a grid turned by a small angle: its cells are cocircular but for the last bits
    const places = lattice(400, 1).map(([x, y]): [number, number] => [x * 0.9999995 - y * 0.001 + 1000, x * 0.001 + y * 0.9999995 + 1000]);
    expectDelaunay(triangulate(flat(places)));
  });

  it('has 2n - 2 - h triangles (Euler)', () => {
    const places = scattered(1000, 5, [0, 0, 1, 1]);
    const hull = Delaunay.from(places).hull.length;
    expect(triangulate(flat(places)).triangleCount).toBe(2 * 1000 - 2 - hull);
  });

  it('names collinear points', () => {
    expect(() => triangulate(flat([[0, 0], [1, 1], [2, 2], [5, 5]]))).toThrow(expect.objectContaining({ code: 'POINTS_COLLINEAR' }) as NumericalError);
  });
});

describe('cutting to loops', () => {
  // a square of 4 around a square hole of 4, and a point outside that no element uses
  const places: [number, number][] = [[0, 0], [6, 0], [6, 6], [0, 6], [2, 2], [4, 2], [4, 4], [2, 4], [20, 3]];

  it('keeps what lies between outer boundary and hole, and marks the edges', () => {
    const t = triangulate(flat(places));
    const missing = cutToLoops(t, [Uint32Array.of(0, 1, 2, 3), Uint32Array.of(4, 7, 6, 5)], [Float64Array.of(1, 2, 3, 4), Float64Array.of(5, 6, 7, 8)]);
    expect(missing).toEqual([]);
    expect(areaOf(t)).toBe(36 - 4);
    const marks = new Set<number>();
    for (let e = 0; e < 3 * t.triangleCount; e++) if (t.twins[e] < 0) marks.add(t.edgeMarks[e]);
    expect([...marks].sort()).toEqual([1, 2, 3, 4, 5, 6, 7, 8]);
  });

  it('changes nothing and lists the edges that are not there', () => {
    const t = triangulate(flat([[0, 0], [10, 0], [10, 1], [0, 1], [5, 0.4], [5, 0.6]]));
    const before = t.triangleCount;
    expect(cutToLoops(t, [Uint32Array.of(0, 2, 3)], [new Float64Array(3)])).toEqual([[0, 0]]);
    expect(t.triangleCount).toBe(before);
  });
});

describe('insertion of a vertex', () => {
  const square = (): Triangulation => {
    const t = triangulate(flat([[0, 0], [1, 0], [1, 1], [0, 1]]));
    cutToLoops(t, [Uint32Array.of(0, 1, 2, 3)], [Float64Array.of(7, 0, 0, 0)]);
    return t;
  };

  it('keeps the triangulation Delaunay and the area as it was, wherever vertices go', () => {
    fc.assert(
      fc.property(fc.array(fc.tuple(fc.integer({ min: 1, max: 31 }), fc.integer({ min: 1, max: 31 })), { maxLength: 40 }), (places) => {
        const t = square();
        const inserter = createInserter(t);
        for (const [x, y] of places) inserter.insert(x / 32, y / 32, 0);
        expectDelaunay(t);
        expect(areaOf(t)).toBeCloseTo(1, 12);
      }),
      { seed: 1, numRuns: 200 },
    );
  });

  it('refuses a place in a boundary edge\'s diametral circle and says which edge', () => {
    const t = square();
    const inserter = createInserter(t);
    expect(inserter.insert(0.5, 0.1, 0)).toBe(-1);
    const e = inserter.blockingEdge;
    expect([t.triangles[e], t.triangles[e % 3 === 2 ? e - 2 : e + 1]]).toEqual([0, 1]);
  });

  it('refuses the place of a vertex, and one beyond the boundary', () => {
    const inserter = createInserter(square());
    expect(inserter.insert(1, 1, 0)).toBe(-2);
    expect(inserter.insert(3, 0.5, 0)).toBe(-1);
  });

  it('splits a boundary edge in two that inherit its mark', () => {
    const t = square();
    const inserter = createInserter(t);
    inserter.insert(0.5, 0.1, 0);
    const e = inserter.blockingEdge;
    expect(inserter.insert(0.5, 0, (e / 3) | 0, e)).toBe(4);
    expectDelaunay(t);
    let marked = 0;
    for (let k = 0; k < 3 * t.triangleCount; k++) if (t.twins[k] < 0 && t.edgeMarks[k] === 7) marked++;
    expect(marked).toBe(2);
  });
});

describe('refinement', () => {
  const side = 100;
  const plain = (size: number, slope: number, extra: [number, number][] = []): Triangulation => {
    const border: [number, number][] = [];
    for (let k = 0; k < 10; k++) border.push([10 * k, 0]);
    for (let k = 0; k < 10; k++) border.push([side, 10 * k]);
    for (let k = 10; k > 0; k--) border.push([10 * k, side]);
    for (let k = 10; k > 0; k--) border.push([0, 10 * k]);
    const t = triangulate(flat([...extra, ...border]));
    cutToLoops(t, [Uint32Array.from(border, (_, k) => extra.length + k)], [new Float64Array(40)]);
    refine(t, { sizeAt: () => size, slope, vertexSize: new Float64Array(t.vertexCount).fill(size), inputCount: extra.length, maxVertices: 100_000 });
    return t;
  };

  it('brings angles to 25 degrees and sizes to what is asked, in about the number of triangles that the area needs', () => {
    const t = plain(10, 0.2);
    expectDelaunay(t);
    const quality = elementQuality(meshOf(t));
    expect(Math.min(...quality.smallestAngle)).toBeGreaterThan(25);
    // a circumradius of 0.84 of the size has edges of at most 1.68 sizes
    expect(Math.max(...quality.longestEdgeKm)).toBeLessThan(16.8);
    const equilateral = (Math.sqrt(3) / 4) * 10 * 10;
    expect(t.triangleCount).toBeLessThan((1.6 * side * side) / equilateral);
    expect(areaOf(t)).toBeCloseTo(side * side, 9);
  });

  it('leaves angles between two near input vertices alone and mends all others', () => {
    const t = plain(10, 0.2, [[50, 50], [50.01, 50]]);
    const { smallestAngle } = elementQuality(meshOf(t));
    for (let k = 0; k < t.triangleCount; k++) {
      const v = [...t.triangles.slice(3 * k, 3 * k + 3)];
      if (v.filter((i) => i < 2).length < 2) expect(smallestAngle[k]).toBeGreaterThan(24.9);
    }
  });

  it('mends the small angle at a short edge from an input vertex to another vertex', () => {
    // 5.2 from a boundary vertex, where triangles may otherwise be as large as the whole square
    const t = plain(100, 1, [[50, 5.2]]);
    expect(Math.min(...elementQuality(meshOf(t)).smallestAngle)).toBeGreaterThan(24.9);
  });

  it('stops at the largest number of vertices and when cancelled', () => {
    const t = triangulate(flat([[0, 0], [1000, 0], [1000, 1000], [0, 1000]]));
    cutToLoops(t, [Uint32Array.of(0, 1, 2, 3)], [new Float64Array(4)]);
    const options = { sizeAt: () => 1, slope: 1, vertexSize: new Float64Array(4).fill(1), inputCount: 0 };
    expect(() => refine(t, { ...options, maxVertices: 500 })).toThrow(expect.objectContaining({ code: 'MESH_TOO_LARGE' }) as NumericalError);
    expect(() => refine(t, { ...options, maxVertices: 1e6, isCancelled: () => true })).toThrow(expect.objectContaining({ code: 'CANCELLED' }) as NumericalError);
  });
});
