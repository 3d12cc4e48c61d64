import { createHash } from 'node:crypto';

import { afterEach, describe, expect, it, vi } from 'vitest';

import { createRecipeRunner, runRecipe } from '#core/design/run-recipe.ts';
import { NumericalError } from '#core/errors.ts';
import { assembleMatrices } from '#core/fem/assembly.ts';
import type { CoordinateReference } from '#core/geometry/mesh.ts';
import { meshBytes } from '#core/geometry/mesh-bytes.ts';
import { elementQuality } from '#core/geometry/quality.ts';
import { greatCircleKm } from '#core/geometry/sphere.ts';
import { createStereographic } from '#core/geometry/stereographic.ts';
import { nonDelaunayEdges } from '#core/geometry/validate.ts';
import { columnsOf, expectSound, recipeOf, seeded } from '#support/meshes.ts';

const R = 6371;
const options = { sphereRadiusKm: R };

const scattered = (count: number, seed: number, [west, south, east, north]: [number, number, number, number]): [number, number][] => {
  const random = seeded(seed);
  return Array.from({ length: count }, () => [west + (east - west) * random(), south + (north - south) * random()]);
};
const hashOf = (mesh: Parameters<typeof meshBytes>[0]): string => createHash('sha256').update(meshBytes(mesh)).digest('hex');

/** Distance of a place to a line of ground points, by brute force over densely sampled sides. */
const distanceToOutline = (crs: CoordinateReference, outline: Float64Array, x: number, y: number): number => {
  let least = Infinity;
  const n = outline.length / 2;
  const projection = createStereographic(outline[0], outline[1], R);
  const p = new Float64Array(9);
  for (let i = 0; i < n; i++) {
    const [ax, ay, bx, by] = [outline[2 * i], outline[2 * i + 1], outline[2 * ((i + 1) % n)], outline[2 * ((i + 1) % n) + 1]];
    for (let k = 0; k <= 400; k++) {
      const t = k / 400;
      if (crs === 'plane-km') {
        least = Math.min(least, Math.hypot(x - ax - t * (bx - ax), y - ay - t * (by - ay)));
        continue;
      }
      // a great circle's points are the normalised chord's; the projection's inverse of its forward gives lon, lat
      const rad = Math.PI / 180;
      const a = [Math.cos(ay * rad) * Math.cos(ax * rad), Math.cos(ay * rad) * Math.sin(ax * rad), Math.sin(ay * rad)];
      const b = [Math.cos(by * rad) * Math.cos(bx * rad), Math.cos(by * rad) * Math.sin(bx * rad), Math.sin(by * rad)];
      const c = a.map((v, d) => v + t * (b[d] - v));
      const r = Math.hypot(...c);
      least = Math.min(least, greatCircleKm(x, y, Math.atan2(c[1], c[0]) / rad, Math.asin(c[2] / r) / rad, R));
    }
  }
  projection.forward(x, y, p, 0);
  return least;
};

const boundaryDistances = (mesh: ReturnType<typeof runRecipe>['mesh']): number[] =>
  mesh.boundaryLoops.flatMap((loop) =>
    [...loop].flatMap((node, k) => {
      const next = loop[(k + 1) % loop.length];
      const c = mesh.coordinates;
      // the middle of an edge is where a chord comes nearest
      const middle: [number, number] = [(c[2 * node] + c[2 * next]) / 2, (c[2 * node + 1] + c[2 * next + 1]) / 2];
      const here = distanceToOutline(mesh.crs, mesh.outline[0], c[2 * node], c[2 * node + 1]);
      return mesh.crs === 'plane-km' ? [here, distanceToOutline(mesh.crs, mesh.outline[0], ...middle)] : [here];
    }),
  );

describe('a mesh in the plane', () => {
  const columns = columnsOf('plane-km', scattered(400, 7, [0, 0, 1000, 600]));

  it('is sound, holds every observation, and keeps the buffer within 1 %', () => {
    const { mesh, selected } = runRecipe(columns, recipeOf({ bufferKm: 150 }), options);
    expectSound(mesh, selected);
    for (const d of boundaryDistances(mesh)) {
      expect(d).toBeGreaterThan(0.99 * 150);
      expect(d).toBeLessThan(1.01 * 150);
    }
  });

  it('has the area of a box pushed out with round corners (Steiner: A + perimeter B + pi B²)', () => {
    const corners = columnsOf('plane-km', [[0, 0], [300, 0], [300, 200], [0, 200], [140, 90]]);
    const { mesh } = runRecipe(corners, recipeOf({ bufferKm: 100, outline: { kind: 'box' } }), options);
    const area = elementQuality(mesh).areaKm2.reduce((sum, a) => sum + a, 0);
    const exact = 300 * 200 + 1000 * 100 + Math.PI * 100 ** 2;
    expect(area).toBeLessThan(exact);
    expect(area).toBeGreaterThan(0.995 * exact);
  });

  it('squares corners off by tangents: a box gives a larger box', () => {
    const corners = columnsOf('plane-km', [[0, 0], [300, 0], [300, 200], [0, 200], [140, 90]]);
    const { mesh, selected } = runRecipe(corners, recipeOf({ bufferKm: 100, outline: { kind: 'box' }, corners: 'square' }), options);
    expectSound(mesh, selected);
    expect(elementQuality(mesh).areaKm2.reduce((sum, a) => sum + a, 0)).toBeCloseTo(500 * 400, 6);
    expect(Math.max(...mesh.boundaryCurvature)).toBe(0);
  });

  it('is Delaunay by the exact test, so that no off-diagonal of K between inner nodes is positive', () => {
    const { mesh } = runRecipe(columns, recipeOf({ bufferKm: 150 }), options);
    expect(nonDelaunayEdges(mesh.triangles, mesh.coordinates)).toEqual([]);
    const { stiffness } = assembleMatrices(mesh);
    let largest = 0;
    for (let c = 0; c < stiffness.columns; c++)
      for (let k = stiffness.colPtr[c]; k < stiffness.colPtr[c + 1]; k++) if (stiffness.rowIdx[k] !== c) largest = Math.max(largest, stiffness.values[k]);
    expect(largest).toBeLessThan(1e-12);
  });

  it('has at least 25 degrees in elements with a filler node, but for a short edge between observations', () => {
    const { mesh } = runRecipe(columns, recipeOf({ bufferKm: 150 }), options);
    const { smallestAngle } = elementQuality(mesh);
    const c = mesh.coordinates;
    const length = (a: number, b: number): number => Math.hypot(c[2 * a] - c[2 * b], c[2 * a + 1] - c[2 * b + 1]);
    let judged = 0;
    for (let t = 0; t < smallestAngle.length; t++) {
      const nodes = [...mesh.triangles.slice(3 * t, 3 * t + 3)];
      if (nodes.every((node) => mesh.nodeKind[node] === 0)) continue;
      const edges = nodes.map((node, k): [number, number] => [node, nodes[(k + 1) % 3]]).sort((p, q) => length(...p) - length(...q));
      if (edges[0].every((node) => mesh.nodeKind[node] === 0)) continue;
      judged++;
      expect(smallestAngle[t]).toBeGreaterThan(24.9);
    }
    expect(judged).toBeGreaterThan(300);
  });

  it('grows no faster from element to element than asked, at the 95th percentile in the buffer', () => {
    const { mesh } = runRecipe(columns, recipeOf({ bufferKm: 400, growth: 1.3, coreSpacingKm: 30 }), options);
    const { areaKm2 } = elementQuality(mesh);
    const owner = new Map<string, number>();
    const ratios: number[] = [];
    const inBuffer = (t: number): boolean => [0, 1, 2].every((k) => mesh.nodeKind[mesh.triangles[3 * t + k]] >= 2);
    for (let t = 0; t < areaKm2.length; t++)
      for (let k = 0; k < 3; k++) {
        const pair = [mesh.triangles[3 * t + k], mesh.triangles[3 * t + ((k + 1) % 3)]].sort((a, b) => a - b).join();
        const other = owner.get(pair);
        if (other === undefined) owner.set(pair, t);
        else if (inBuffer(t) && inBuffer(other)) ratios.push(Math.sqrt(Math.max(areaKm2[t] / areaKm2[other], areaKm2[other] / areaKm2[t])));
      }
    ratios.sort((a, b) => a - b);
    expect(ratios.length).toBeGreaterThan(100);
    expect(ratios[Math.floor(0.95 * ratios.length)]).toBeLessThan(1.5);
  });

  it('fills a gap down to the core spacing', () => {
    const { mesh } = runRecipe(columnsOf('plane-km', [[0, 0], [500, 0], [500, 500], [0, 500]]), recipeOf({ bufferKm: 100, coreSpacingKm: 40 }), options);
    const { longestEdgeKm } = elementQuality(mesh);
    for (let t = 0; t < longestEdgeKm.length; t++)
      if ([0, 1, 2].every((k) => mesh.nodeKind[mesh.triangles[3 * t + k]] <= 1)) expect(longestEdgeKm[t]).toBeLessThan(2 * 40);
  });

  it.each([1e-3, 1e3])('has the same triangles when everything is scaled by a power of two near %f', (factor) => {
    const scale = 2 ** Math.round(Math.log2(factor));
    const small = columnsOf('plane-km', scattered(60, 3, [0, 0, 100, 100]));
    const large = { ...small, x: small.x.map((v) => v * scale), y: small.y.map((v) => v * scale) };
    const a = runRecipe(small, recipeOf({ bufferKm: 32, coreSpacingKm: 8 }), options).mesh;
    const b = runRecipe(large, recipeOf({ bufferKm: 32 * scale, coreSpacingKm: 8 * scale }), options).mesh;
    expect([...b.triangles]).toEqual([...a.triangles]);
    expect([...b.coordinates]).toEqual([...a.coordinates].map((v) => v * scale));
  });
});

describe('a mesh on the sphere', () => {
  const regions: [string, [number, number][]][] = [
    ['mid-latitudes', scattered(200, 11, [-30, 40, -10, 55])],
    ['across the antimeridian', scattered(200, 12, [170, -15, 190, 5]).map(([lon, lat]) => [lon >= 180 ? lon - 360 : lon, lat])],
    ['round the north pole', scattered(200, 13, [-180, 75, 180, 90])],
    ['round the south pole', scattered(150, 14, [-180, -90, 180, -80])],
    ['with a station at the pole', [[0, 90], [0, 80], [120, 80], [-120, 80], [60, 85]]],
  ];

  it.each(regions)('%s: is sound and keeps the buffer within 1 %%', (_name, points) => {
    const { mesh, selected } = runRecipe(columnsOf('lonlat-deg', points), recipeOf({ bufferKm: 300, coreSpacingKm: 150 }), options);
    expectSound(mesh, selected);
    for (const d of boundaryDistances(mesh)) {
      expect(d).toBeGreaterThan(0.99 * 300);
      expect(d).toBeLessThan(1.01 * 300);
    }
  });

  it('is spherical Delaunay: the triangulation of another stereographic projection passes the exact test too', () => {
    const { mesh } = runRecipe(columnsOf('lonlat-deg', regions[1][1]), recipeOf({ bufferKm: 300, coreSpacingKm: 150 }), options);
    const projection = createStereographic(171, 4, R);
    const plane = new Float64Array(mesh.coordinates.length);
    for (let i = 0; i < plane.length / 2; i++) projection.forward(mesh.coordinates[2 * i], mesh.coordinates[2 * i + 1], plane, 2 * i);
    expect(nonDelaunayEdges(mesh.triangles, plane).length).toBeLessThan(3);
  });
});

describe('errors', () => {
  const code = (work: () => unknown): string => {
    try {
      work();
    } catch (error) {
      if (error instanceof NumericalError) return error.code;
      throw error;
    }
    return 'none';
  };

  it.each([
    ['one point', 'TOO_FEW_POINTS', columnsOf('plane-km', [[1, 1]])],
    ['two points', 'TOO_FEW_POINTS', columnsOf('lonlat-deg', [[1, 1], [2, 2]])],
    ['the same place three times', 'TOO_FEW_POINTS', columnsOf('lonlat-deg', [[1, 1], [1, 1], [1, 1]])],
    ['three collinear points', 'POINTS_COLLINEAR', columnsOf('plane-km', [[0, 0], [1, 1], [2, 2]])],
    ['points along a meridian', 'POINTS_COLLINEAR', columnsOf('lonlat-deg', [[10, 0], [10, 10], [10, 20], [10, 33]])],
    ['points all round the globe', 'POINTS_TOO_WIDE', columnsOf('lonlat-deg', [[0, 0], [90, 0], [180, 0], [-90, 0], [0, 90], [0, -90]])],
  ])('%s: %s', (_name, expected, columns) => {
    expect(code(() => runRecipe(columns, recipeOf({ bufferKm: 100 }), options))).toBe(expected);
  });

  it('a buffer too small for the core spacing asks for too many boundary nodes', () => {
    const columns = columnsOf('plane-km', [[0, 0], [10_000, 0], [0, 10_000]]);
    expect(code(() => runRecipe(columns, recipeOf({ bufferKm: 0.001, coreSpacingKm: 100 }), options))).toBe('MESH_TOO_LARGE');
  });

  it('cancels', () => {
    const columns = columnsOf('plane-km', scattered(3000, 5, [0, 0, 100, 100]));
    expect(code(() => runRecipe(columns, recipeOf({ bufferKm: 50, coreSpacingKm: 1 }), { ...options, isCancelled: () => true }))).toBe('CANCELLED');
  });
});

describe('determinism', () => {
  afterEach(() => void vi.restoreAllMocks());

  it('uses none of the functions whose bits depend on the platform, nor chance, nor the clock', () => {
    const points = scattered(120, 21, [170, 60, 200, 75]).map(([lon, lat]): [number, number] => [lon > 180 ? lon - 360 : lon, lat]);
    const expected = hashOf(runRecipe(columnsOf('lonlat-deg', points), recipeOf({ bufferKm: 200 }), options).mesh);
    for (const name of ['sin', 'cos', 'tan', 'asin', 'acos', 'atan', 'atan2', 'exp', 'log', 'log2', 'log10', 'pow', 'hypot', 'cbrt', 'sinh', 'random'] as const)
      vi.spyOn(Math, name).mockImplementation(() => {
        throw new Error(`Math.${name} was called`);
      });
    vi.spyOn(Date, 'now').mockImplementation(() => {
      throw new Error('Date.now was called');
    });
    const sphere = hashOf(runRecipe(columnsOf('lonlat-deg', points), recipeOf({ bufferKm: 200 }), options).mesh);
    runRecipe(columnsOf('plane-km', points), recipeOf({ bufferKm: 20, corners: 'square', outline: { kind: 'box' } }), options);
    vi.restoreAllMocks();
    expect(sphere).toBe(expected);
  });

  it('gives the bytes it gave before: a recorded hash', () => {
    const { mesh } = runRecipe(columnsOf('lonlat-deg', scattered(100, 33, [-5, 50, 5, 56])), recipeOf({ bufferKm: 150 }), options);
    expect(hashOf(mesh)).toMatchInlineSnapshot(`"0a81f75083b0bffa74b8942aa0bc2b70cb015bba218e2c16a4694d1599a0d95d"`);
  });

  it('gives the same bytes when a runner keeps what the buffer does not change', () => {
    const columns = columnsOf('lonlat-deg', scattered(300, 34, [-5, 50, 5, 56]));
    const run = createRecipeRunner(columns);
    run(recipeOf({ bufferKm: 90 }), options);
    for (const bufferKm of [100, 180]) expect(hashOf(run(recipeOf({ bufferKm }), options).mesh)).toBe(hashOf(runRecipe(columns, recipeOf({ bufferKm }), options).mesh));
  });

  it('changes when one coordinate changes in its last place', () => {
    const points = scattered(50, 35, [-5, 50, 5, 56]);
    const before = hashOf(runRecipe(columnsOf('lonlat-deg', points), recipeOf({ bufferKm: 150 }), options).mesh);
    points[17][0] += 2 ** -52 * Math.abs(points[17][0]);
    expect(hashOf(runRecipe(columnsOf('lonlat-deg', points), recipeOf({ bufferKm: 150 }), options).mesh)).not.toBe(before);
  });
});
