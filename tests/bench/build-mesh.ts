// Times of meshes built from recipes, by point set and size. The largest sizes with BENCH_LARGE=1.
import { performance } from 'node:perf_hooks';

import { createRecipeRunner, runRecipe } from '#core/design/run-recipe.ts';
import type { Place } from '#support/point-sets.ts';
import { bell, columnsOf, lattice, recipeOf, ring, scattered, swaths, wrapped } from '#support/point-sets.ts';

const SPACING = 25;
const BUFFER = 300;
const sets: { name: string; crs: 'plane-km' | 'lonlat-deg'; make: (count: number) => Place[]; largest: number }[] = [
  { name: 'uniform', crs: 'plane-km', make: (n) => scattered(n, 1, [0, 0, SPACING * Math.sqrt(n), SPACING * Math.sqrt(n)]), largest: 1_000_000 },
  { name: 'bell', crs: 'plane-km', make: (n) => bell(n, 2, (SPACING * Math.sqrt(n)) / 4), largest: 1_000_000 },
  { name: 'lattice', crs: 'plane-km', make: (n) => lattice(n, SPACING), largest: 1_000_000 },
  { name: 'swaths', crs: 'plane-km', make: (n) => swaths(n, 3, SPACING), largest: 1_000_000 },
  { name: 'circle', crs: 'plane-km', make: (n) => ring(n, (SPACING * n) / 20), largest: 10_000 },
  { name: 'sphere', crs: 'lonlat-deg', make: (n) => wrapped(scattered(n, 4, [150, -30, 210, 30])), largest: 100_000 },
];
const sizes = [1_000, 10_000, 100_000, ...(process.env['BENCH_LARGE'] === '1' ? [1_000_000] : [])];
const options = { sphereRadiusKm: 6371 };

const median = (values: number[]): number => values.sort((a, b) => a - b)[values.length >> 1];
const time = (work: () => void): number => {
  const start = performance.now();
  work();
  return performance.now() - start;
};
const row = (cells: (string | number)[]): string => cells.map((cell, k) => (k < 1 ? String(cell).padEnd(9) : String(cell).padStart(12))).join('');

console.log('Medians in ms. "whole" is selection, outline, local spacing and mesh; "again" only what a moved buffer costs.');
console.log(`Buffer ${BUFFER} km, growth 1.2, core spacing derived. "rate" is the exponent of time over observations since the row above, of "again".\n`);
console.log(row(['points', 'observations', 'nodes', 'elements', 'whole', 'again', 'rate', 'memory MB']));
for (const { name, crs, make, largest } of sets) {
  let before: { count: number; ms: number } | null = null;
  for (const size of sizes) {
    if (size > largest) continue;
    const places = make(size);
    const columns = columnsOf(crs, places);
    const repeats = size >= 1_000_000 ? 1 : size >= 100_000 ? 3 : 15;
    let nodes = 0, elements = 0, peak = 0;
    const whole: number[] = [];
    const again: number[] = [];
    for (let k = 0; k < Math.min(repeats, 5); k++) whole.push(time(() => void runRecipe(columns, recipeOf({ bufferKm: BUFFER }), options)));
    const run = createRecipeRunner(columns);
    run(recipeOf({ bufferKm: BUFFER }), options);
    for (let k = 1; k <= repeats; k++)
      again.push(
        time(() => {
          const { mesh } = run(recipeOf({ bufferKm: BUFFER * (1 + k / 1000) }), options);
          nodes = mesh.nodeKind.length;
          elements = mesh.triangles.length / 3;
        }),
      );
    peak = process.memoryUsage().rss / 2 ** 20;
    const ms = median(again);
    const rate = before ? (Math.log(ms / before.ms) / Math.log(places.length / before.count)).toFixed(2) : '';
    console.log(row([name, places.length, nodes, elements, median(whole).toFixed(0), ms.toFixed(0), rate, peak.toFixed(0)]));
    before = { count: places.length, ms };
  }
}
