import type { ObservationColumns } from '#core/design/observations.ts';
import type { Recipe } from '#core/design/recipe.ts';
import type { CoordinateReference } from '#core/geometry/mesh.ts';

export type Place = [number, number];

/** Numbers in [0, 1) from a seed: a linear congruential generator (Park & Miller 1988, minimal standard). */
export const seeded = (seed: number): (() => number) => {
  let state = seed % 2147483647 || 1;
  return () => (state = (state * 48271) % 2147483647) / 2147483647;
};

export const columnsOf = (crs: CoordinateReference, points: readonly (readonly [number, number])[]): ObservationColumns => ({
  crs,
  x: Float64Array.from(points, ([x]) => x),
  y: Float64Array.from(points, ([, y]) => y),
  line: Uint32Array.from(points, (_, i) => i + 2),
});

export const recipeOf = (change: Partial<Recipe> & { bufferKm: number }): Recipe => ({
  selection: { near: { km: 0, rule: 'combine' } },
  outline: { kind: 'convex' },
  corners: 'round',
  growth: 1.2,
  ...change,
});

/** Places spread evenly over a rectangle; longitudes may run beyond 180. */
export const scattered = (count: number, seed: number, [west, south, east, north]: [number, number, number, number]): Place[] => {
  const random = seeded(seed);
  return Array.from({ length: count }, () => [west + (east - west) * random(), south + (north - south) * random()]);
};

/** Longitudes brought into [-180, 180). */
export const wrapped = (places: Place[]): Place[] => places.map(([lon, lat]) => [lon - 360 * Math.floor((lon + 180) / 360), lat]);

/** Places in a bell about the origin, the standard deviation `spread` (Box & Muller 1958). */
export const bell = (count: number, seed: number, spread: number): Place[] => {
  const random = seeded(seed);
  return Array.from({ length: count }, () => {
    const r = spread * Math.sqrt(-2 * Math.log(1 - random()));
    const angle = 2 * Math.PI * random();
    return [r * Math.cos(angle), r * Math.sin(angle)];
  });
};

/** A square lattice of at least `count` places, `step` apart. */
export const lattice = (count: number, step: number): Place[] => {
  const side = Math.ceil(Math.sqrt(count));
  return Array.from({ length: side * side }, (_, k) => [step * (k % side), step * Math.floor(k / side)]);
};

/** Places evenly on a circle: every one a corner of the hull. */
export const ring = (count: number, radius: number): Place[] =>
  Array.from({ length: count }, (_, k) => [radius * Math.cos((2 * Math.PI * k) / count), radius * Math.sin((2 * Math.PI * k) / count)]);

/** Two crossing swaths of scan lines `step` apart with jitter, each with a gap of missing lines. */
export const swaths = (count: number, seed: number, step: number): Place[] => {
  const random = seeded(seed);
  const across = Math.max(8, Math.round(Math.sqrt(count / 16)));
  const along = Math.ceil(count / 2 / across / 0.9);
  const places: Place[] = [];
  for (const lean of [0.5, -0.5])
    for (let line = 0; line < along; line++) {
      if (line > 0.4 * along && line < 0.5 * along) continue;
      for (let k = 0; k < across; k++) {
        const u = step * (line - along / 2 + 0.3 * random());
        const v = step * (k - across / 2 + 0.3 * random());
        places.push([u * Math.cos(lean) - v * Math.sin(lean), u * Math.sin(lean) + v * Math.cos(lean)]);
      }
    }
  return places;
};
