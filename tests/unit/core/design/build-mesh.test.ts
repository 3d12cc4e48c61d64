import { createHash } from 'node:crypto';

import { afterEach, describe, expect, it, vi } from 'vitest';

import type { DesignedMesh } from '#core/design/designed-mesh.ts';
import { createRecipeRunner, runRecipe } from '#core/design/run-recipe.ts';
import { NumericalError } from '#core/errors.ts';
import { assembleMatrices } from '#core/fem/assembly.ts';
import { meshBytes } from '#core/geometry/mesh-bytes.ts';
import { nodePositions } from '#core/geometry/positions.ts';
import { elementQuality } from '#core/geometry/quality.ts';
import { sphericalExcess } from '#core/geometry/sphere.ts';
import { createStereographic } from '#core/geometry/stereographic.ts';
import { nonDelaunayEdges } from '#core/geometry/validate.ts';
import { expectSound } from '#support/meshes.ts';
import { angleBetween, distanceToRing, placeBetween, vectorOf } from '#support/outline-distance.ts';
import type { Place } from '#support/point-sets.ts';
import { columnsOf, recipeOf, scattered, wrapped } from '#support/point-sets.ts';

const R = 6371;
const options = { sphereRadiusKm: R };

const hashOf = (mesh: Parameters<typeof meshBytes>[0]): string => createHash('sha256').update(meshBytes(mesh)).digest('hex');

/** Distances to the outline from four places on every boundary edge, in buffers. */
const boundaryDistances = (mesh: DesignedMesh, bufferKm: number): number[] =>
  mesh.boundaryLoops.flatMap((loop) =>
    Array.from(loop, (node, k) => {
      const c = mesh.coordinates;
      const next = loop[(k + 1) % loop.length];
      return [0, 0.25, 0.5, 0.75].map((share) => {
        const [x, y] = placeBetween(mesh.crs, [c[2 * node], c[2 * node + 1]], [c[2 * next], c[2 * next + 1]], share);
        return distanceToRing(mesh.crs, mesh.outline[0], x, y, R) / bufferKm;
      });
    }).flat(),
  );

describe('a mesh in the plane', () => {
  const columns = columnsOf('plane-km', scattered(400, 7, [0, 0, 1000, 600]));

  it('is sound, holds every observation, and keeps the buffer within 1 %', () => {
    const { mesh, selected } = runRecipe(columns, recipeOf({ bufferKm: 150 }), options);
    expectSound(mesh, selected);
    for (const d of boundaryDistances(mesh, 150)) expect(Math.abs(d - 1)).toBeLessThan(0.01);
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

  it('has elements no larger than the core spacing plus the growth times the distance from the outline', () => {
    const [coreSpacingKm, growth] = [20, 1.3];
    const { mesh } = runRecipe(columns, recipeOf({ bufferKm: 400, growth, coreSpacingKm }), options);
    const { longestEdgeKm } = elementQuality(mesh);
    const c = mesh.coordinates;
    // an element of size h has a circumradius of at most 0.84 h; the mean of three corners' sizes is no more than the largest
    for (let t = 0; t < longestEdgeKm.length; t++) {
      const reach = Math.max(...[0, 1, 2].map((k) => distanceToRing('plane-km', mesh.outline[0], c[2 * mesh.triangles[3 * t + k]], c[2 * mesh.triangles[3 * t + k] + 1], R)));
      const size = coreSpacingKm + ((2 * (growth - 1)) / (growth + 1)) * reach;
      expect(longestEdgeKm[t]).toBeLessThan(2 * 0.84 * size);
    }
  });

  it('grows from a dense cluster no faster than asked', () => {
    const cluster = scattered(300, 18, [480, 280, 520, 320]);
    const around: Place[] = [[0, 0], [1000, 0], [1000, 600], [0, 600]];
    const { mesh, selected } = runRecipe(columnsOf('plane-km', [...cluster, ...around]), recipeOf({ bufferKm: 200, coreSpacingKm: 100 }), options);
    expectSound(mesh, selected);
    const { longestEdgeKm } = elementQuality(mesh);
    const slope = (2 * 0.2) / 2.2;
    for (let t = 0; t < longestEdgeKm.length; t++) {
      const nodes = [...mesh.triangles.slice(3 * t, 3 * t + 3)];
      const away = Math.max(...nodes.map((i) => Math.max(0, Math.hypot(mesh.coordinates[2 * i] - 500, mesh.coordinates[2 * i + 1] - 300) - 20)));
      // the cluster's own largest spacing is below 8 km
      expect(longestEdgeKm[t]).toBeLessThan(2 * 0.84 * (8 + slope * away));
    }
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
  const regions: { name: string; points: Place[] }[] = [
    { name: 'mid-latitudes', points: scattered(200, 11, [-30, 40, -10, 55]) },
    { name: 'across the antimeridian', points: wrapped(scattered(200, 12, [170, -15, 190, 5])) },
    { name: 'round the north pole', points: scattered(200, 13, [-180, 75, 180, 90]) },
    { name: 'round the south pole', points: scattered(150, 14, [-180, -90, 180, -80]) },
    { name: 'a station at the pole', points: [[0, 90], [0, 80], [120, 80], [-120, 80], [60, 85]] },
    { name: 'nearly a hemisphere', points: scattered(200, 15, [-180, 15, 180, 90]) },
  ];

  it.each(regions)('$name: is sound and keeps the buffer within 1 %', ({ points }) => {
    const { mesh, selected } = runRecipe(columnsOf('lonlat-deg', points), recipeOf({ bufferKm: 300, coreSpacingKm: 150 }), options);
    expectSound(mesh, selected);
    for (const d of boundaryDistances(mesh, 300)) expect(Math.abs(d - 1)).toBeLessThan(0.01);
  });

  it.each(regions)('$name: squares corners off nowhere nearer than the buffer, nor farther than its tangents', ({ points }) => {
    const { mesh, selected } = runRecipe(columnsOf('lonlat-deg', points), recipeOf({ bufferKm: 300, coreSpacingKm: 150, corners: 'square' }), options);
    expectSound(mesh, selected);
    for (const d of boundaryDistances(mesh, 300)) {
      expect(d).toBeGreaterThan(0.99);
      expect(d).toBeLessThan(Math.SQRT2);
    }
  });

  it('has the area of the outline pushed out (Steiner on the sphere: 2 pi (1 - cos b) + L sin b + A cos b; Santaló 1976)', () => {
    const points: Place[] = [[0, 0], [30, 0], [30, 40], [5, 45]];
    const bufferKm = 600;
    const { mesh } = runRecipe(columnsOf('lonlat-deg', points), recipeOf({ bufferKm, coreSpacingKm: 150 }), options);
    const vectors = new Float64Array(nodePositions(mesh).map((v) => v / R));
    let area = 0;
    for (let t = 0; t < mesh.triangles.length; t += 3) area += sphericalExcess(vectors, 3 * mesh.triangles[t], 3 * mesh.triangles[t + 1], 3 * mesh.triangles[t + 2]);
    const corners = points.map(([lon, lat]) => vectorOf(lon, lat));
    const length = corners.reduce((sum, v, k) => sum + angleBetween(v, corners[(k + 1) % 4]), 0);
    // Girard: the outline's area is 2 pi less its exterior angles
    const inside = 2 * Math.PI - mesh.outlineCorners.reduce((sum, corner) => sum + corner.turning, 0);
    const beta = bufferKm / R;
    const exact = 2 * Math.PI * (1 - Math.cos(beta)) + length * Math.sin(beta) + inside * Math.cos(beta);
    expect(area / exact).toBeGreaterThan(0.997);
    expect(area / exact).toBeLessThan(1.0005);
  });

  it.each([1, 4, 10, 51])('has the same triangles when all observations are turned over a pole or the antimeridian (seed %i)', (seed) => {
    const points = scattered(200, seed, [-30, 40, -10, 55]);
    const turn = (v: number[], i: number, j: number, by: number): number[] => {
      const w = [...v];
      w[i] = v[i] * Math.cos(by) - v[j] * Math.sin(by);
      w[j] = v[i] * Math.sin(by) + v[j] * Math.cos(by);
      return w;
    };
    const turned = (about: number, over: number): Place[] =>
      points.map(([lon, lat]) => {
        const [x, y, z] = turn(turn([...vectorOf(lon, lat)], 0, 1, about), 0, 2, over);
        return [(Math.atan2(y, x) * 180) / Math.PI, (Math.asin(z) * 180) / Math.PI];
      });
    const recipe = recipeOf({ bufferKm: 300 });
    const still = runRecipe(columnsOf('lonlat-deg', points), recipe, options).mesh;
    const { areaKm2 } = elementQuality(still);
    for (const [about, over] of [[2.9, 0], [0, 0.8], [1, 2]] as const) {
      const { mesh } = runRecipe(columnsOf('lonlat-deg', turned(about, over)), recipe, options);
      expect([...mesh.triangles]).toEqual([...still.triangles]);
      elementQuality(mesh).areaKm2.forEach((area, t) => expect(Math.abs(area / areaKm2[t] - 1)).toBeLessThan(1e-9));
    }
  });

  it('is spherical Delaunay: the triangulation of another stereographic projection passes the exact test too', () => {
    const { mesh } = runRecipe(columnsOf('lonlat-deg', regions[1].points), recipeOf({ bufferKm: 300, coreSpacingKm: 150 }), options);
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

  it('a buffer that would wrap round the globe', () => {
    const columns = columnsOf('lonlat-deg', scattered(100, 6, [-180, 20, 180, 90]));
    expect(code(() => runRecipe(columns, recipeOf({ bufferKm: 8500, coreSpacingKm: 500 }), options))).toBe('POINTS_TOO_WIDE');
  });

  it.each([
    ['bufferKm', recipeOf({ bufferKm: 0 })],
    ['bufferKm', recipeOf({ bufferKm: NaN })],
    ['growth', recipeOf({ bufferKm: 10, growth: 1 })],
    ['coreSpacingKm', recipeOf({ bufferKm: 10, coreSpacingKm: -1 })],
  ])('a recipe with a bad %s names it', (field, recipe) => {
    const columns = columnsOf('plane-km', [[0, 0], [100, 0], [0, 100]]);
    expect(() => runRecipe(columns, recipe, options)).toThrow(expect.objectContaining({ code: 'RECIPE_INVALID', details: { field } }) as NumericalError);
  });

  it('cancels', () => {
    const columns = columnsOf('plane-km', scattered(3000, 5, [0, 0, 100, 100]));
    expect(code(() => runRecipe(columns, recipeOf({ bufferKm: 50, coreSpacingKm: 1 }), { ...options, isCancelled: () => true }))).toBe('CANCELLED');
  });
});

describe('determinism', () => {
  afterEach(() => void vi.restoreAllMocks());

  it('uses none of the functions whose bits depend on the platform, nor chance, nor the clock', () => {
    const points = wrapped(scattered(120, 21, [170, 60, 200, 75]));
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
    expect(hashOf(mesh)).toMatchInlineSnapshot(`"c1d8478f7b78f107a2b78741cd25419f097bf5f43451b5a3592d4a4976e99582"`);
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
