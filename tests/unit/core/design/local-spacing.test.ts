import fc from 'fast-check';
import { describe, expect, it } from 'vitest';

import { clipVoronoi } from '#core/design/clipped-voronoi.ts';
import { derivedCoreSpacing, localSpacing } from '#core/design/local-spacing.ts';
import { NumericalError } from '#core/errors.ts';

const R = 6371;
const plane = (points: [number, number][]) => ({
  crs: 'plane-km' as const,
  x: Float64Array.from(points, ([x]) => x),
  y: Float64Array.from(points, ([, y]) => y),
});
const lonLat = (points: [number, number][]) => ({ ...plane(points), crs: 'lonlat-deg' as const });
const sum = (values: Float64Array): number => values.reduce((total, value) => total + value, 0);

/** Area of the convex hull by the monotone chain (Andrew 1979) and the shoelace formula. */
const hullArea = (points: [number, number][]): number => {
  const sorted = [...points].sort((a, b) => a[0] - b[0] || a[1] - b[1]);
  const cross = (o: number[], a: number[], b: number[]): number => (a[0] - o[0]) * (b[1] - o[1]) - (a[1] - o[1]) * (b[0] - o[0]);
  const chain = (list: [number, number][]): [number, number][] => {
    const hull: [number, number][] = [];
    for (const p of list) {
      while (hull.length > 1 && cross(hull[hull.length - 2], hull[hull.length - 1], p) <= 0) hull.pop();
      hull.push(p);
    }
    return hull.slice(0, -1);
  };
  const hull = [...chain(sorted), ...chain(sorted.reverse())];
  return hull.reduce((area, [ax, ay], k) => area + ax * hull[(k + 1) % hull.length][1] - hull[(k + 1) % hull.length][0] * ay, 0) / 2;
};

const grid = (columns: number, rows: number, h: number): [number, number][] =>
  Array.from({ length: columns * rows }, (_, k) => [h * (k % columns), h * Math.floor(k / columns)]);

describe('localSpacing', () => {
  it('gives a square lattice its own spacing inside and the disc bound on its edges', () => {
    const { spacingKm, cellAreaKm2 } = localSpacing(plane(grid(6, 5, 3)), 0);
    expect(spacingKm[7]).toBeCloseTo(3, 10);
    // a corner's cell is a quarter of a square, the disc of half the distance to a neighbour has sqrt(pi)/2 of it
    expect(cellAreaKm2[0]).toBeCloseTo(9 / 4, 10);
    expect(spacingKm[0]).toBeCloseTo((3 * Math.sqrt(Math.PI)) / 2, 10);
    expect(sum(cellAreaKm2)).toBeCloseTo(15 * 12, 8);
  });

  // area of a hexagon cell at unit distance: sqrt(3)/2
  it('gives a triangular lattice the root of its hexagon', () => {
    const points = Array.from({ length: 81 }, (_, k): [number, number] => [(k % 9) + (Math.floor(k / 9) % 2) / 2, (Math.floor(k / 9) * Math.sqrt(3)) / 2]);
    expect(localSpacing(plane(points), 0).spacingKm[40]).toBeCloseTo(Math.sqrt(Math.sqrt(3) / 2), 10);
  });

  it('tiles the hull with cells, whatever the points and their scale', () => {
    // squares of smaller coordinates underflow
    const coordinate = fc.double({ min: -100, max: 100, noNaN: true }).map((v) => (Math.abs(v) < 1e-12 ? 0 : v));
    const cloud = fc.oneof(
      fc.array(fc.tuple(coordinate, coordinate), { minLength: 3, maxLength: 80 }),
      fc.array(fc.tuple(coordinate, fc.double({ min: 1e-12, max: 0.01, noNaN: true })), { minLength: 3, maxLength: 80 }),
      fc.array(fc.tuple(fc.integer({ min: 0, max: 6 }), fc.integer({ min: 0, max: 6 })), { minLength: 3, maxLength: 60 }),
    );
    fc.assert(
      fc.property(cloud, fc.constantFrom(1e-9, 1, 1e9), (points, scale) => {
        const scaled = points.map(([x, y]): [number, number] => [x * scale, y * scale]);
        const extent = Math.max(...scaled.map(([x, y]) => Math.hypot(x - scaled[0][0], y - scaled[0][1])));
        // points that all but touch share a cell, which the sum must not count twice
        const distinct: [number, number][] = [];
        for (const [x, y] of scaled) if (!distinct.some(([a, b]) => Math.hypot(x - a, y - b) <= 1e-8 * extent)) distinct.push([x, y]);
        const area = hullArea(distinct);
        const { cellAreaKm2, spacingKm } = localSpacing(plane(distinct), 0);
        if (area > 1e-6 * extent ** 2) expect(sum(cellAreaKm2) / area).toBeCloseTo(1, 8);
        if (distinct.length > 1) expect(spacingKm.every((s) => s > 0 && s <= 2 * extent)).toBe(true);
        const repeated = localSpacing(plane([...scaled, ...scaled]), 0).spacingKm;
        for (let i = 0; i < scaled.length; i++) expect(repeated[i + scaled.length]).toBe(repeated[i]);
      }),
      { numRuns: 400 },
    );
  });

  it('is never below the disc of half the distance to the nearest point', () => {
    const points: [number, number][] = [[0, 0], [10, 0.001], [20, -0.001], [30, 0], [40, 0.002]];
    const { spacingKm } = localSpacing(plane(points), 0);
    for (const s of spacingKm) expect(s).toBeGreaterThanOrEqual((Math.sqrt(Math.PI) / 2) * 10 - 1e-9);
  });

  it('uses neighbours on a line, both points of two, and 0 for a single place', () => {
    const disc = Math.sqrt(Math.PI) / 2;
    const line = localSpacing(plane([[0, 0], [1, 1], [4, 4], [2, 2]]), 0);
    expect([...line.spacingKm].map((s) => s / Math.SQRT2 / disc)).toEqual([1, 1, 2, 1].map((s) => expect.closeTo(s, 10)));
    expect([...line.cellAreaKm2]).toEqual([0, 0, 0, 0]);
    expect([...localSpacing(plane([[0, 0], [3, 4]]), 0).spacingKm]).toEqual([disc * 5, disc * 5]);
    expect([...localSpacing(plane([[7, 7], [7, 7]]), 0).spacingKm]).toEqual([0, 0]);
    expect(localSpacing(plane([]), 0).spacingKm.length).toBe(0);
  });

  it('gives a small set on the sphere the spacing that it has in the plane, anywhere', () => {
    const h = 2;
    for (const [lon, lat] of [[0, 0], [179.99, 60], [-70, -85], [20, 75]] as [number, number][]) {
      const degree = (R * Math.PI) / 180;
      const points = grid(7, 7, h).map(([x, y]): [number, number] => {
        const placed = lon + x / (degree * Math.cos((lat * Math.PI) / 180));
        return [placed >= 180 ? placed - 360 : placed, lat + y / degree];
      });
      expect(localSpacing(lonLat(points), R).spacingKm[24]).toBeCloseTo(h, 1);
    }
  });

  // the cells of points spread evenly over the sphere each have the share 4 pi R² / n (lattice: González 2010)
  it('gives points all over the sphere their share of its area', () => {
    const n = 2000;
    const points = Array.from({ length: n }, (_, k): [number, number] => {
      const lon = (k * 222.49223594996) % 360;
      return [lon >= 180 ? lon - 360 : lon, (Math.asin(1 - (2 * k + 1) / n) * 180) / Math.PI];
    });
    const { spacingKm } = localSpacing(lonLat(points), R);
    const expected = Math.sqrt((4 * Math.PI * R * R) / n);
    const sorted = [...spacingKm].sort((a, b) => a - b);
    expect(sorted[n / 2] / expected).toBeCloseTo(1, 1);
    expect(sorted[Math.floor(0.01 * n)] / expected).toBeGreaterThan(0.8);
    expect(sorted[Math.floor(0.99 * n)] / expected).toBeLessThan(1.2);
  });

  it('gives the cells, in the coordinates of the points', () => {
    const { cells, cellAreaKm2 } = localSpacing(plane(grid(5, 5, 2)), 0, { withCells: true });
    const ring = [...(cells?.coordinates ?? [])].slice(2 * (cells?.start[12] ?? 0), 2 * (cells?.start[13] ?? 0));
    const corners = Array.from({ length: ring.length / 2 }, (_, k) => `${ring[2 * k].toFixed(9)} ${ring[2 * k + 1].toFixed(9)}`);
    expect([...new Set(corners)].sort()).toEqual(['3.000000000 3.000000000', '3.000000000 5.000000000', '5.000000000 3.000000000', '5.000000000 5.000000000']);
    expect(cellAreaKm2[12]).toBeCloseTo(4, 10);
    const sphere = localSpacing(lonLat(grid(4, 4, 0.1)), R, { withCells: true });
    const inside = [...(sphere.cells?.coordinates ?? [])];
    expect(inside.every((c) => c > -0.001 && c < 0.301)).toBe(true);
  });

  it('refuses a position that is not finite', () => {
    expect(() => localSpacing(plane([[0, 0], [NaN, 1]]), 0)).toThrow(NumericalError);
  });

  it('does not change when the platform has other transcendental functions', () => {
    const run = () => [localSpacing(lonLat(grid(9, 9, 0.37)), R), localSpacing(plane([[0, 0], [1, 1], [2, 2]]), 0)];
    const before = run();
    const names = ['sin', 'cos', 'tan', 'atan2', 'asin', 'acos', 'exp', 'log', 'pow', 'hypot'] as const;
    const saved = Object.fromEntries(names.map((name) => [name, Math[name]]));
    try {
      Object.assign(Math, Object.fromEntries(names.map((name) => [name, () => { throw new Error(`Math.${name}`); }])));
      expect(run()).toEqual(before);
    } finally {
      Object.assign(Math, saved);
    }
  });
});

describe('clipVoronoi', () => {
  it('tiles the hull of points on a circle and on an arc about one of them', () => {
    const circle = Array.from({ length: 500 }, (_, k): [number, number] => [5e5 * Math.cos(k / 79.6), 5e5 * Math.sin(k / 79.6)]);
    const arc: [number, number][] = [[0, 0], ...Array.from({ length: 300 }, (_, k): [number, number] => [1e6 * Math.cos(k / 400), 1e6 * Math.sin(k / 400)])];
    for (const points of [circle, arc]) expect(sum(clipVoronoi(Float64Array.from(points.flat())).area) / hullArea(points)).toBeCloseTo(1, 10);
  });
});

describe('derivedCoreSpacing', () => {
  it('is the median, whatever a few gaps and near pairs do', () => {
    expect(derivedCoreSpacing(new Float64Array([1, 5, 5, 5, 90]))).toBe(5);
    expect(derivedCoreSpacing(new Float64Array([0, 4, 2, 3]))).toBe(3);
  });

  it('does not fill a wide hull with the spacing of a crowded corner', () => {
    const spacing = new Float64Array(1000).fill(0.1).map((s, i) => (i < 300 ? 100 : s));
    const core = derivedCoreSpacing(spacing);
    // the hull's area over 20,000 nodes
    expect(core).toBeCloseTo(Math.sqrt((300 * 100 ** 2 + 700 * 0.01) / 20_000), 10);
  });

  it('asks for a spacing where there is only one place', () => {
    expect(() => derivedCoreSpacing(new Float64Array([0, 0]))).toThrow(/Give the core spacing in km/);
  });
});
