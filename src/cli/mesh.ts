import { runRecipe } from '#core/design/run-recipe.ts';
import { readCsvObservations } from '#core/formats/csv-observations.ts';
import { detectFormat } from '#core/formats/detect-format.ts';
import { readGeoJsonObservations } from '#core/formats/geojson-observations.ts';
import { recipeSchema } from '#schemas/recipe.ts';
import { parseValue } from '#server/respond.ts';

import { type Flags, numberFlag, readBytes, readJson, required } from './flags.ts';
import { createStopwatch } from './stopwatch.ts';

const pairs = (flat: Float64Array): number[][] => Array.from({ length: flat.length / 2 }, (_, i) => [flat[2 * i], flat[2 * i + 1]]);
const triples = (flat: Uint32Array): number[][] => Array.from({ length: flat.length / 3 }, (_, t) => [flat[3 * t], flat[3 * t + 1], flat[3 * t + 2]]);

const run = async (flags: Flags): Promise<unknown> => {
  const watch = createStopwatch();
  watch.enter('read');
  const recipe = parseValue(recipeSchema, await readJson('recipe', required(flags, 'recipe')));
  const bytes = await readBytes('points', required(flags, 'points'));
  const sphereRadiusKm = numberFlag(flags, 'radius-km') ?? 6371;
  const read = detectFormat(bytes.subarray(0, 65_536)) === 'csv' ? await readCsvObservations([bytes], undefined) : await readGeoJsonObservations(bytes, undefined);
  const { selected, mesh } = runRecipe(read.columns, recipe, { sphereRadiusKm, onPhase: watch.enter });
  watch.enter('document');
  const rowNode = new Int32Array(read.columns.x.length).fill(-1);
  for (let i = 0; i < selected.x.length; i++)
    for (let k = selected.rowStart[i]; k < selected.rowStart[i + 1]; k++) rowNode[selected.rows[k]] = mesh.observationNode[i];
  const document = {
    crs: mesh.crs,
    ...(mesh.crs === 'lonlat-deg' && { radiusKm: mesh.radiusKm }),
    nodes: pairs(mesh.coordinates),
    triangles: triples(mesh.triangles),
    nodeKind: [...mesh.nodeKind],
    observationNode: [...mesh.observationNode],
    rowNode: [...rowNode],
    rows: { read: read.rowsRead, accepted: read.columns.x.length, rejected: read.rejectedCount },
    rejected: read.rejected,
    coreSpacingKm: mesh.coreSpacingKm,
  };
  return { ...document, timings: watch.finish() };
};

/** `selvage mesh`: points and recipe to a mesh document. */
export const meshCommand = { flags: ['points', 'recipe', 'radius-km'], run } as const;
