import fc from 'fast-check';
import { describe, expect, it } from 'vitest';

import { runRecipe } from '#core/design/run-recipe.ts';
import { NumericalError } from '#core/errors.ts';
import { expectSound } from '#support/meshes.ts';
import { columnsOf, recipeOf } from '#support/point-sets.ts';

const RUNS = process.env['SELVAGE_NIGHTLY'] === '1' ? 3000 : 100;

/** Codes that say that the observations, not the program, rule a mesh out. */
const EXPLAINED = new Set(['TOO_FEW_POINTS', 'POINTS_COLLINEAR', 'POINTS_TOO_CLOSE', 'POINTS_TOO_WIDE', 'MESH_TOO_LARGE', 'NOT_CONVERGED']);

const meshOrReason = (points: [number, number][], crs: 'plane-km' | 'lonlat-deg', bufferKm: number, corners: 'round' | 'square', kind: 'convex' | 'box', coreSpacingKm?: number): string => {
  try {
    const recipe = recipeOf({ bufferKm, corners, outline: { kind }, ...(coreSpacingKm !== undefined && { coreSpacingKm }) });
    const { mesh, selected } = runRecipe(columnsOf(crs, points), recipe, { sphereRadiusKm: 6371 });
    expectSound(mesh, selected);
    return 'mesh';
  } catch (error) {
    if (!(error instanceof NumericalError)) throw error;
    expect(EXPLAINED.has(error.code), error.code).toBe(true);
    expect(error.message).toMatch(/[.]$/);
    return error.code;
  }
};

const corners = fc.constantFrom('round' as const, 'square' as const);
const outline = fc.constantFrom('convex' as const, 'box' as const);

describe('any set of points gives a sound mesh or a reason', () => {
  it('in the plane: lattices, duplicates, lines and near coincidences', () => {
    const coordinate = fc.oneof(fc.integer({ min: -5, max: 5 }), fc.integer({ min: -5000, max: 5000 }).map((k) => k / 1000), fc.constantFrom(1e-9, -1e-9, 1 + 2 ** -40, 3));
    let meshes = 0;
    fc.assert(
      fc.property(fc.array(fc.tuple(coordinate, coordinate), { minLength: 1, maxLength: 40 }), corners, outline, fc.constantFrom(0.5, 2, 10), (points, shape, kind, bufferKm) => {
        if (meshOrReason(points, 'plane-km', bufferKm, shape, kind, 1) === 'mesh') meshes++;
      }),
      { numRuns: RUNS, seed: 20261201 },
    );
    expect(meshes).toBeGreaterThan(RUNS / 2);
  });

  it('in the plane: tiny, huge and far from the origin', () => {
    const share = fc.integer({ min: 0, max: 2 ** 20 }).map((k) => k / 2 ** 20);
    const point = fc.tuple(share, share);
    fc.assert(
      fc.property(fc.array(point, { minLength: 4, maxLength: 30 }), fc.constantFrom(1e-6, 1, 1e6), fc.constantFrom(0, 5e3), (points, scale, away) => {
        meshOrReason(points.map(([x, y]) => [away + scale * x, away + scale * y]), 'plane-km', scale / 2, 'round', 'convex', scale / 4);
      }),
      { numRuns: RUNS, seed: 20261201 },
    );
  });

  it('on the sphere: anywhere, poles and antimeridian included', () => {
    const near = (value: number, spread: number): fc.Arbitrary<number> => fc.double({ min: value - spread, max: value + spread, noNaN: true });
    const wrap = (lon: number): number => ((((lon + 180) % 360) + 360) % 360) - 180;
    const clamp = (lat: number): number => Math.max(-90, Math.min(90, lat));
    const places = fc.constantFrom([0, 0], [180, 0], [-180, 45], [30, 90], [0, -90], [77, 88]).chain(([lon, lat]) =>
      fc.array(fc.tuple(fc.oneof(near(lon, 12), fc.constantFrom(lon, lon + 1)), fc.oneof(near(lat, 9), fc.constantFrom(lat, lat - 1))), { minLength: 1, maxLength: 30 }),
    );
    let meshes = 0;
    fc.assert(
      fc.property(places, corners, outline, fc.constantFrom(50, 700), (points, shape, kind, bufferKm) => {
        if (meshOrReason(points.map(([lon, lat]) => [wrap(lon), clamp(lat)]), 'lonlat-deg', bufferKm, shape, kind, 200) === 'mesh') meshes++;
      }),
      { numRuns: RUNS, seed: 20261201 },
    );
    expect(meshes).toBeGreaterThan(RUNS / 3);
  });

  it('on the whole globe', () => {
    const point = fc.tuple(fc.double({ min: -180, max: 179.999, noNaN: true }), fc.double({ min: -90, max: 90, noNaN: true }));
    fc.assert(
      fc.property(fc.array(point, { minLength: 1, maxLength: 12 }), (points) => void meshOrReason(points, 'lonlat-deg', 500, 'round', 'convex', 500)),
      { numRuns: RUNS, seed: 20261201 },
    );
  });
});
